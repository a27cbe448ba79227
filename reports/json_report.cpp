#include "reports/fault_report.hpp"
#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

namespace {

class JsonPiece : public ReportPiece {
 public:
  JsonPiece(const Study& study, bool intermediate) : study_(study), intermediate_(intermediate) {}

  void fault(const StudiedFault& studied) override {
    const FaultResult& r = studied.result;
    const iec60909::Quantities* iec = studied.iec60909;
    if (!text.empty()) text += ",\n";
    text += "{\"bus\": " + bus(r.fault.bus) + ", \"fault\": \"" + fault_name(r.fault.kind) +
            "\", \"case_kind\": \"" + case_kind_name(studied.case_kind) + "\", \"current_ka\": ";
    const ieee_c37::Quantities* c37 = studied.c37;
    append_shortest(text, iec != nullptr ? iec->ikss_ka : r.current_ka);
    text += ", \"x_over_r\": ";
    optional(c37 != nullptr ? c37->first_cycle.x_over_r : r.x_over_r);
    text += ", \"peak_ka\": ";
    optional(iec != nullptr ? iec->ip_ka : c37 != nullptr ? c37->crest_ka : r.peak_ka);
    if (iec != nullptr) iec60909_members(*iec, studied.inside_unit);
    if (c37 != nullptr) c37_members(*c37);
    text += ", \"prefault_kv\": ";
    append_shortest(text, r.prefault_kv);
    phasors(r.sequence_ka);
    text += ", \"earth_current_ka\": ";
    append_shortest(text, std::abs(r.earth_current_ka));
    text += ", \"z1_ohm\": ";
    impedance(r.z1_ohm);
    text += ", \"z2_ohm\": ";
    impedance(r.z2_ohm);
    text += ", \"z0_ohm\": ";
    impedance(r.z0_ohm);
    currents("contributions", r.contributions);
    text += ", \"voltages\": [";
    for (std::size_t i = 0; i < r.voltages.size(); ++i) {
      text += (i > 0 ? ", " : "") + std::string("{\"bus\": ") + bus(r.voltages[i].bus);
      phasors(r.voltages[i].sequence_kv);
      text += '}';
    }
    text += ']';
    if (study_.options().fault.depth > 0) currents("branch_currents", r.branch_currents);
    text += ", \"neutral_currents\": [";
    for (std::size_t i = 0; i < r.neutrals.size(); ++i) {
      text += (i > 0 ? ", " : "") + std::string("{\"element\": ") + id(r.neutrals[i].element) +
              ", \"bus\": " + bus(r.neutrals[i].bus) + ", \"current_ka\": ";
      polar(r.neutrals[i].current_ka);
      text += '}';
    }
    text += "]}";
  }

  std::string text;

 private:
  void iec60909_members(const iec60909::Quantities& q, bool inside_unit) {
    text += ", \"iec60909\": {\"c\": ";
    append_shortest(text, q.c);
    append_member(text, "ikss_ka", q.ikss_ka);
    append_member(text, "skss_mva", q.skss_mva);
    append_member(text, "r_over_x", q.r_over_x);
    append_member(text, "kappa", q.kappa);
    append_member(text, "ip_ka", q.ip_ka);
    append_member(text, "ib_ka", q.ib_ka);
    append_member(text, "idc_ka", q.idc_ka);
    append_member(text, "ib_asymmetric_ka", q.ib_asymmetric_ka);
    append_member(text, "ik_ka", q.ik_ka);
    append_member(text, "m", q.m);
    append_member(text, "n", q.n);
    append_member(text, "ith_ka", q.ith_ka);
    append_member(text, "i2t_ka2s", q.i2t_ka2s);
    append_member(text, "converter_ka", q.converter_ka);
    append_member(text, "motor_share_percent", q.motor_share_percent);
    if (inside_unit) text += ", \"inside_power_station_unit\": true";
    text += ", \"not_evaluated\": [";
    for (std::size_t i = 0; i < q.not_evaluated.size(); ++i)
      text += (i > 0 ? ", " : "") + std::string("{\"quantity\": ") + json_text(q.not_evaluated[i].quantity) +
              ", \"why\": " + json_text(q.not_evaluated[i].why) + "}";
    text += ']';
    if (intermediate_ && !q.machines.empty()) {
      text += ", \"machines\": [";
      for (std::size_t i = 0; i < q.machines.size(); ++i) {
        const iec60909::MachinePart& m = q.machines[i];
        text += (i > 0 ? ", " : "") + std::string("{\"element\": ") + id(m.element);
        append_member(text, "ikss_ka", m.ikss_ka);
        append_member(text, "ikss_over_ir", m.ratio);
        append_member(text, "mu", m.mu);
        if (m.q) append_member(text, "q", m.q);
        text += '}';
      }
      text += ']';
    }
    text += '}';
  }
  void c37_members(const ieee_c37::Quantities& q) {
    const auto network = [&](const char* name, const ieee_c37::NetworkCurrent& n) {
      text += std::string("\"") + name + "\": {\"ez_ka\": ";
      append_shortest(text, n.ez_ka);
      append_member(text, "ex_ka", n.ex_ka);
      append_member(text, "x_over_r", n.x_over_r);
      append_member(text, "complex_x_over_r", n.complex_x_over_r);
    };
    text += ", \"c37\": {";
    network("first_cycle", q.first_cycle);
    append_member(text, "asymmetric_ka", q.asymmetric_ka);
    append_member(text, "crest_ka", q.crest_ka);
    text += "}, ";
    network("interrupting", q.interrupting);
    append_member(text, "nacd", q.nacd);
    text += '}';
    append_member(text, "delayed_ka", q.delayed_ka);
    text += '}';
  }
  std::string id(ElementRef ref) const { return json_text(element(study_.network(), ref).id); }
  std::string bus(BusIndex b) const { return json_text(study_.network().bus(b).id); }
  void optional(const std::optional<double>& value) {
    if (value)
      append_shortest(text, *value);
    else
      text += "null";
  }
  void two(double a, double b) {
    text += '[';
    append_shortest(text, a);
    text += ", ";
    append_shortest(text, b);
    text += ']';
  }
  void pair(Complex z) { two(z.real(), z.imag()); }
  void polar(Complex value) { two(std::abs(value), degrees(value)); }
  void impedance(const std::optional<Complex>& z) {
    if (z)
      pair(*z);
    else
      text += "null";
  }
  void phasors(const BySequence<Complex>& sequence) {
    const auto phases = to_phases(sequence);
    const char* names[] = {", \"phases\": {\"a\": ", ", \"b\": ", ", \"c\": "};
    for (int p = 0; p < 3; ++p) {
      text += names[p];
      polar(phases[p]);
    }
    const char* numbers[] = {"}, \"sequence\": {\"0\": ", ", \"1\": ", ", \"2\": "};
    for (int s = 0; s < 3; ++s) {
      text += numbers[s];
      polar(sequence[s]);
    }
    text += '}';
  }
  void currents(const char* name, const std::vector<Contribution>& list) {
    text += std::string(", \"") + name + "\": [";
    for (std::size_t i = 0; i < list.size(); ++i) {
      text += (i > 0 ? ", " : "") + std::string("{\"element\": ") + id(list[i].element) +
              ", \"bus\": " + bus(list[i].bus);
      phasors(list[i].sequence_ka);
      text += '}';
    }
    text += ']';
  }

  const Study& study_;
  bool intermediate_;
};

class JsonReport : public FaultReport {
 public:
  JsonReport(const Studies& studies, ReportFacts facts, Sink sink)
      : studies_(studies), study_(*studies.front()), facts_(std::move(facts)), sink_(std::move(sink)) {}

  void begin() override {
    sink_(json_heading(studies_, facts_));
    if (facts_.intermediate) sink_(json_corrections(studies_));
    sink_("\"faults\": [");
  }
  std::unique_ptr<ReportPiece> make_piece() const override {
    return std::make_unique<JsonPiece>(study_, facts_.intermediate);
  }
  void add(ReportPiece& piece) override {
    std::string& text = static_cast<JsonPiece&>(piece).text;
    if (text.empty()) return;
    sink_(first_ ? "\n" : ",\n");
    first_ = false;
    sink_(text);
    text.clear();
  }

  void end(const CrossCheck* check) override {
    std::string out = "\n]";
    if (check != nullptr) {
      out += ",\n\"cross_check\": {\"largest_relative_difference\": ";
      append_shortest(out, check->largest);
      out += ", \"faults\": " + std::to_string(check->faults) +
             ", \"bus\": " + json_text(study_.network().bus(check->bus).id) + ", \"fault\": \"" +
             fault_name(check->kind) + "\", \"quantity\": " + json_text(check->quantity) + "}";
    }
    sink_(out + "\n}\n");
  }

 private:
  Studies studies_;
  const Study& study_;
  ReportFacts facts_;
  Sink sink_;
  bool first_ = true;
};

}  // namespace

std::unique_ptr<FaultReport> json_report(const Studies& studies, const ReportFacts& facts, Sink sink) {
  return std::make_unique<JsonReport>(studies, facts, std::move(sink));
}

}  // namespace kiloamp
