#include "reports/json_parts.hpp"

#include <nlohmann/json.hpp>

#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

std::string json_text(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

namespace {

void append_list(std::string& out, const std::vector<std::string>& texts) {
  out += '[';
  for (std::size_t i = 0; i < texts.size(); ++i) out += (i > 0 ? ",\n " : "\n ") + json_text(texts[i]);
  out += ']';
}
void append_pair(std::string& out, Complex z) {
  out += '[';
  append_shortest(out, z.real());
  out += ", ";
  append_shortest(out, z.imag());
  out += ']';
}

}  // namespace

std::string json_heading(const Study& study, const ReportFacts& facts) {
  const StudyOptions& o = study.options();
  std::string out =
      "{\n\"format\": \"kiloamp-results\", \"version\": 1, \"study\": " + json_text(facts.study) +
      ", \"method\": \"classical\",\n\"case\": {\"title\": " +
      (study.network().title ? json_text(*study.network().title) : "null") +
      ", \"file\": " + json_text(facts.file) + ", \"sha256\": " + json_text(facts.sha256) +
      "},\n\"scenario\": " + (study.scenario_id().empty() ? "null" : json_text(study.scenario_id())) +
      ", \"case_kind\": \"" + (o.case_kind == CaseKind::max ? "max" : "min") + "\", \"frequency_hz\": ";
  append_shortest(out, study.network().frequency_hz);
  out += ", \"base_mva\": ";
  append_shortest(out, study.network().base());
  out += ",\n\"prefault\": " + json_text(prefault_words(study)) + ",\n\"fault_impedance\": {\"phase_ohm\": ";
  append_pair(out, o.phase_ohm);
  out += ", \"earth_ohm\": ";
  append_pair(out, o.earth_ohm);
  out += "},\n\"peak\": " + json_text(kPeakFormula) + ",\n\"defaults_used\": [";
  const char* gap = "\n";
  for (const DefaultUse& use : study.defaults_used()) {
    out += gap + std::string(" {\"field\": ") + json_text(use.field) +
           ", \"value\": " + json_text(use.value) + ", \"source\": " + json_text(use.source) +
           ", \"elements\": [";
    for (std::size_t i = 0; i < use.elements.size(); ++i)
      out += (i > 0 ? ", " : "") + json_text(element(study.network(), use.elements[i]).id);
    out += "]}";
    gap = ",\n";
  }
  out += "],\n\"warnings\": ";
  append_list(out, study.warnings());
  out += ",\n\"cautions\": ";
  append_list(out, cautions());
  out += ",\n";
  return out;
}

}  // namespace kiloamp
