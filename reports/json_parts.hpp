// Pieces that every JSON document of results has.
#pragma once
#include <string>

#include "reports/fault_report.hpp"

namespace kiloamp {

/// A JSON string, quotes included.
[[nodiscard]] std::string json_text(const std::string& text);
/// From the opening brace to the cautions: what was studied, how, and with which assumptions. Ends ready for
/// the study's own members.
[[nodiscard]] std::string json_heading(const Study& study, const ReportFacts& facts);

}  // namespace kiloamp
