// Pieces that every JSON document of results has.
#pragma once
#include <string>

#include "reports/fault_report.hpp"

namespace kiloamp {

/// A JSON string, quotes included.
[[nodiscard]] std::string json_text(const std::string& text);
/// `, "name": value`, null for an empty one.
void append_member(std::string& out, const char* name, const std::optional<double>& value);
/// From the opening brace to the cautions: what was studied, how, and with which assumptions. Ends ready for
/// the study's own members.
[[nodiscard]] std::string json_heading(const Studies& studies, const ReportFacts& facts);

/// The same members from "defaults_used" to "cautions", for a study of its own kind; ends ready for the next
/// member.
[[nodiscard]] std::string json_assumptions(const Network& network, const std::vector<DefaultUse>& defaults,
                                           const std::vector<std::string>& warnings);

/// "corrections": what the method changed on which element, with the impedance that came out [r, x]; ends
/// ready for the next member.
[[nodiscard]] std::string json_corrections(const Studies& studies);

}  // namespace kiloamp
