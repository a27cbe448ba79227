// What a study assumed, in words that every report uses.
#pragma once
#include <string>

#include "engine/study/study.hpp"

namespace kiloamp {

/// One study, or the same case once for the largest and once for the smallest currents; never empty.
using Studies = std::vector<const Study*>;

/// "classical", "iec60909", "c37".
[[nodiscard]] const char* method_name(Method method);
[[nodiscard]] std::string method_words(const StudyOptions& options);
/// "max" or "min".
[[nodiscard]] const char* case_kind_name(CaseKind kind);
[[nodiscard]] std::string case_kind_words(const StudyOptions& options);
/// Warnings of all studies; one that not every study has says whose it is.
[[nodiscard]] std::vector<std::string> warnings_of(const Studies& studies);
/// How the peak is found, for the method at hand.
[[nodiscard]] std::string peak_words(const StudyOptions& options);
[[nodiscard]] std::string prefault_words(const Study& study);
[[nodiscard]] std::string fault_impedance_words(const StudyOptions& options);
/// "3ph", "LG", "LL", "LLG".
[[nodiscard]] const char* fault_short_name(FaultKind kind);
/// "three-phase", "line to ground on phase a", ...
[[nodiscard]] const char* fault_words(FaultKind kind);

/// Degrees in (-180, 180].
[[nodiscard]] double degrees(Complex value);

}  // namespace kiloamp
