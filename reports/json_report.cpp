#include "reports/fault_report.hpp"
#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

namespace {

class JsonPiece : public ReportPiece {
 public:
  explicit JsonPiece(const Study& study) : study_(study) {}

  void fault(const FaultResult& r) override {
    if (!text.empty()) text += ",\n";
    text += "{\"bus\": " + bus(r.fault.bus) + ", \"fault\": \"" + fault_name(r.fault.kind) +
            "\", \"current_ka\": ";
    append_shortest(text, r.current_ka);
    text += ", \"x_over_r\": ";
    optional(r.x_over_r);
    text += ", \"peak_ka\": ";
    optional(r.peak_ka);
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
};

class JsonReport : public FaultReport {
 public:
  JsonReport(const Study& study, ReportFacts facts, Sink sink)
      : study_(study), facts_(std::move(facts)), sink_(std::move(sink)) {}

  void begin() override { sink_(json_heading(study_, facts_) + "\"faults\": ["); }
  std::unique_ptr<ReportPiece> make_piece() const override { return std::make_unique<JsonPiece>(study_); }
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
  const Study& study_;
  ReportFacts facts_;
  Sink sink_;
  bool first_ = true;
};

}  // namespace

std::unique_ptr<FaultReport> json_report(const Study& study, const ReportFacts& facts, Sink sink) {
  return std::make_unique<JsonReport>(study, facts, std::move(sink));
}

}  // namespace kiloamp
