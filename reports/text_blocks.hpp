// Paragraphs of the text reports.
#pragma once
#include <string>

#include "reports/fault_report.hpp"

namespace kiloamp {

/// `text` broken at spaces to kTextWidth; the first line begins with `first`, the others are indented as far.
[[nodiscard]] std::string paragraph(const std::string& first, const std::string& text);
/// Case, state, prefault voltage, fault impedance, peak formula where there are peaks, defaults, warnings.
[[nodiscard]] std::string heading_block(const Studies& studies, const ReportFacts& facts);
[[nodiscard]] std::string defaults_block(const Network& network, const std::vector<DefaultUse>& defaults);
/// `remarks`: how many values `check` would remark on.
[[nodiscard]] std::string warnings_block(const std::vector<std::string>& warnings, std::size_t remarks,
                                         const std::string& file);
[[nodiscard]] std::string cautions_block();

}  // namespace kiloamp
