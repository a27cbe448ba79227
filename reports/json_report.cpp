#include "reports/fault_report.hpp"
#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

namespace {

constexpr std::size_t kFlushAt = 1 << 16;

class JsonReport : public FaultReport {
 public:
  JsonReport(const Study& study, ReportFacts facts, Sink sink)
      : study_(study), facts_(std::move(facts)), sink_(std::move(sink)) {}

  void begin() override { out_ = json_heading(study_, facts_) + "\"faults\": ["; }

  void fault(const FaultResult& r) override {
    out_ += first_ ? "\n" : ",\n";
    first_ = false;
    out_ += "{\"bus\": " + bus(r.fault.bus) + ", \"fault\": \"" + fault_name(r.fault.kind) +
            "\", \"current_ka\": ";
    append_shortest(out_, r.current_ka);
    out_ += ", \"x_over_r\": ";
    optional(r.x_over_r);
    out_ += ", \"peak_ka\": ";
    optional(r.peak_ka);
    out_ += ", \"prefault_kv\": ";
    append_shortest(out_, r.prefault_kv);
    phasors(r.sequence_ka);
    out_ += ", \"earth_current_ka\": ";
    append_shortest(out_, std::abs(r.earth_current_ka));
    out_ += ", \"z1_ohm\": ";
    impedance(r.z1_ohm);
    out_ += ", \"z2_ohm\": ";
    impedance(r.z2_ohm);
    out_ += ", \"z0_ohm\": ";
    impedance(r.z0_ohm);
    currents("contributions", r.contributions);
    out_ += ", \"voltages\": [";
    for (std::size_t i = 0; i < r.voltages.size(); ++i) {
      out_ += (i > 0 ? ", " : "") + std::string("{\"bus\": ") + bus(r.voltages[i].bus);
      phasors(r.voltages[i].sequence_kv);
      out_ += '}';
    }
    out_ += ']';
    if (study_.options().fault.depth > 0) currents("branch_currents", r.branch_currents);
    out_ += ", \"neutral_currents\": [";
    for (std::size_t i = 0; i < r.neutrals.size(); ++i) {
      out_ += (i > 0 ? ", " : "") + std::string("{\"element\": ") + id(r.neutrals[i].element) +
              ", \"bus\": " + bus(r.neutrals[i].bus) + ", \"current_ka\": ";
      polar(r.neutrals[i].current_ka);
      out_ += '}';
    }
    out_ += "]}";
    if (out_.size() >= kFlushAt) flush();
  }

  void end(const CrossCheck* check) override {
    out_ += "\n]";
    if (check != nullptr) {
      out_ += ",\n\"cross_check\": {\"largest_relative_difference\": ";
      append_shortest(out_, check->largest);
      out_ += ", \"faults\": " + std::to_string(check->faults) + ", \"bus\": " + bus(check->bus) +
              ", \"fault\": \"" + fault_name(check->kind) +
              "\", \"quantity\": " + json_text(check->quantity) + "}";
    }
    out_ += "\n}\n";
    flush();
  }

 private:
  std::string id(ElementRef ref) const { return json_text(element(study_.network(), ref).id); }
  std::string bus(BusIndex b) const { return json_text(study_.network().bus(b).id); }
  void optional(const std::optional<double>& value) {
    if (value)
      append_shortest(out_, *value);
    else
      out_ += "null";
  }
  void two(double a, double b) {
    out_ += '[';
    append_shortest(out_, a);
    out_ += ", ";
    append_shortest(out_, b);
    out_ += ']';
  }
  void pair(Complex z) { two(z.real(), z.imag()); }
  void polar(Complex value) { two(std::abs(value), degrees(value)); }
  void impedance(const std::optional<Complex>& z) {
    if (z)
      pair(*z);
    else
      out_ += "null";
  }
  void phasors(const BySequence<Complex>& sequence) {
    const auto phases = to_phases(sequence);
    const char* names[] = {", \"phases\": {\"a\": ", ", \"b\": ", ", \"c\": "};
    for (int p = 0; p < 3; ++p) {
      out_ += names[p];
      polar(phases[p]);
    }
    const char* numbers[] = {"}, \"sequence\": {\"0\": ", ", \"1\": ", ", \"2\": "};
    for (int s = 0; s < 3; ++s) {
      out_ += numbers[s];
      polar(sequence[s]);
    }
    out_ += '}';
  }
  void currents(const char* name, const std::vector<Contribution>& list) {
    out_ += std::string(", \"") + name + "\": [";
    for (std::size_t i = 0; i < list.size(); ++i) {
      out_ += (i > 0 ? ", " : "") + std::string("{\"element\": ") + id(list[i].element) +
              ", \"bus\": " + bus(list[i].bus);
      phasors(list[i].sequence_ka);
      out_ += '}';
    }
    out_ += ']';
  }
  void flush() {
    sink_(out_);
    out_.clear();
  }

  const Study& study_;
  ReportFacts facts_;
  Sink sink_;
  std::string out_;
  bool first_ = true;
};

}  // namespace

std::unique_ptr<FaultReport> json_report(const Study& study, const ReportFacts& facts, Sink sink) {
  return std::make_unique<JsonReport>(study, facts, std::move(sink));
}

}  // namespace kiloamp
