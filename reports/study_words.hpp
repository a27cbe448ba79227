// What a study assumed, in words that every report uses.
#pragma once
#include <string>

#include "engine/study/study.hpp"

namespace kiloamp {

[[nodiscard]] std::string case_kind_words(const StudyOptions& options);
[[nodiscard]] std::string prefault_words(const Study& study);
[[nodiscard]] std::string fault_impedance_words(const StudyOptions& options);
inline constexpr const char* kPeakFormula =
    "kappa sqrt(2) I with kappa = 1.02 + 0.98 exp(-3 R/X) (IEC 60909-0, 8.1), R/X of the loop impedance of "
    "the fault";
/// "3ph", "LG", "LL", "LLG".
[[nodiscard]] const char* fault_short_name(FaultKind kind);
/// "three-phase", "line to ground on phase a", ...
[[nodiscard]] const char* fault_words(FaultKind kind);

/// Degrees in (-180, 180].
[[nodiscard]] double degrees(Complex value);

}  // namespace kiloamp
