#include "reports/json_parts.hpp"

#include <nlohmann/json.hpp>

#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

std::string json_text(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

void append_member(std::string& out, const char* name, const std::optional<double>& value) {
  out += std::string(", \"") + name + "\": ";
  if (value)
    append_shortest(out, *value);
  else
    out += "null";
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

std::string json_heading(const Studies& studies, const ReportFacts& facts) {
  const Study& study = *studies.front();
  const StudyOptions& o = study.options();
  const bool iec = o.method == Method::iec60909;
  std::string out =
      "{\n\"format\": \"kiloamp-results\", \"version\": 1, \"study\": " + json_text(facts.study) +
      ", \"method\": \"" + method_name(o.method) +
      "\",\n\"case\": {\"title\": " + (study.network().title ? json_text(*study.network().title) : "null") +
      ", \"file\": " + json_text(facts.file) + ", \"sha256\": " + json_text(facts.sha256) +
      "},\n\"scenario\": " + (study.scenario_id().empty() ? "null" : json_text(study.scenario_id())) +
      ", \"case_kind\": \"" + (studies.size() > 1 ? "both" : case_kind_name(o.case_kind)) +
      "\", \"frequency_hz\": ";
  append_shortest(out, study.network().frequency_hz);
  out += ", \"base_mva\": ";
  append_shortest(out, study.network().base());
  if (iec) {
    out += std::string(",\n\"iec60909\": {\"edition\": ") +
           (o.iec60909.edition == iec60909::Edition::e2016 ? "2016" : "2001") + ", \"kappa_method\": \"" +
           "abc"[static_cast<std::size_t>(o.iec60909.kappa)] + "\", \"tmin_s\": ";
    append_shortest(out, o.iec60909.tmin_s);
    out += ", \"duration_s\": ";
    append_shortest(out, o.iec60909.duration_s);
    out +=
        ", \"conductor_temperature\": \"max: 20 degrees C; min: end of the short circuit\", "
        "\"motor_rules\": [";
    const auto& rules = study.iec60909()->motor_rules();
    for (std::size_t i = 0; i < rules.size(); ++i) {
      out += (i > 0 ? ", " : "") + std::string("{\"element\": ") +
             json_text(element(study.network(), rules[i].place).id) + ", \"value\": ";
      append_shortest(out, rules[i].value);
      out += ", \"limit\": ";
      append_shortest(out, rules[i].limit);
      out +=
          std::string(", \"would_allow_neglecting\": ") + (rules[i].would_allow() ? "true" : "false") + "}";
    }
    out += "]}";
  }
  if (o.method == Method::c37)
    out += std::string(",\n\"c37\": {\"small_motors\": \"") +
           (o.c37.small_motors == ieee_c37::SmallMotors::combined ? "in" : "out") + "\"}";
  for (const Study* s : studies) {
    out +=
        std::string(",\n\"prefault") + (s == &study ? "" : "_min") + "\": " + json_text(prefault_words(*s));
  }
  out += ",\n\"fault_impedance\": {\"phase_ohm\": ";
  append_pair(out, o.phase_ohm);
  out += ", \"earth_ohm\": ";
  append_pair(out, o.earth_ohm);
  out += "}";
  if (facts.peaks) out += ",\n\"peak\": " + json_text(peak_words(o));
  return out + ",\n" + json_assumptions(study.network(), study.defaults_used(), warnings_of(studies));
}

std::string json_assumptions(const Network& network, const std::vector<DefaultUse>& defaults,
                             const std::vector<std::string>& warnings) {
  std::string out = "\"defaults_used\": [";
  const char* gap = "\n";
  for (const DefaultUse& use : defaults) {
    out += gap + std::string(" {\"field\": ") + json_text(use.field) +
           ", \"value\": " + json_text(use.value) + ", \"source\": " + json_text(use.source) +
           ", \"elements\": [";
    for (std::size_t i = 0; i < use.elements.size(); ++i)
      out += (i > 0 ? ", " : "") + json_text(element(network, use.elements[i]).id);
    out += "]}";
    gap = ",\n";
  }
  out += "],\n\"warnings\": ";
  append_list(out, warnings);
  out += ",\n\"cautions\": ";
  append_list(out, cautions());
  out += ",\n";
  return out;
}

std::string json_corrections(const Studies& studies) {
  std::string out = "\"corrections\": [";
  const char* gap = "\n";
  for (const Study* study : studies) {
    const Network& n = study->network();
    for (const iec60909::Correction& c : study->corrections()) {
      out += gap + std::string(" {\"case_kind\": \"") + case_kind_name(study->options().case_kind) +
             "\", \"element\": " + json_text(element(n, c.element).id) + ", \"factor\": " + json_text(c.name);
      if (c.element.kind == ElementKind::three_winding_transformer) {
        static constexpr const char* kPairs[] = {"hv_mv", "hv_lv", "mv_lv"};
        out += std::string(", \"pair\": \"") + kPairs[c.part] + "\"";
      }
      out += ", \"value\": ";
      append_shortest(out, c.factor);
      if (const auto z = iec60909::corrected_ohm(n, c)) {
        out += ", \"corrected_ohm\": ";
        append_pair(out, *z);
      }
      out += "}";
      gap = ",\n";
    }
  }
  return out + "],\n";
}

}  // namespace kiloamp
