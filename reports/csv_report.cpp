#include "reports/fault_report.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

namespace {

constexpr int kAmount = 6, kAngle = 3;

}  // namespace

std::string csv_field(const std::string& text) {
  if (text.find_first_of(",\"\r\n") == std::string::npos) return text;
  std::string out = "\"";
  for (const char c : text) {
    if (c == '"') out += '"';
    out += c;
  }
  return out + '"';
}

namespace {

class CsvPiece : public ReportPiece {
 public:
  CsvPiece(const Study& study, CsvTable table, const std::vector<std::string>& bus_fields)
      : study_(study), table_(table), bus_fields_(bus_fields) {}

  void fault(const FaultResult& r) override {
    if (table_ == CsvTable::contributions) {
      for (const Contribution& c : r.contributions) contribution(r, c);
      for (const Contribution& c : r.branch_currents) contribution(r, c);
      return;
    }
    text += bus_fields_[at(r.fault.bus)];
    amount(study_.network().bus(r.fault.bus).nominal_kv);
    text += ',';
    text += fault_name(r.fault.kind);
    amount(r.current_ka);
    optional(r.x_over_r);
    optional(r.peak_ka);
    amount(std::abs(r.earth_current_ka));
    phasors(r.sequence_ka);
    impedance(r.z1_ohm);
    impedance(r.z2_ohm);
    impedance(r.z0_ohm);
    text += "\r\n";
  }

  std::string text;

 private:
  void contribution(const FaultResult& r, const Contribution& c) {
    text += bus_fields_[at(r.fault.bus)];
    text += ',';
    text += fault_name(r.fault.kind);
    text += ',';
    text += csv_field(element(study_.network(), c.element).id);
    text += ',';
    text += bus_fields_[at(c.bus)];
    phasors(c.sequence_ka);
    text += "\r\n";
  }
  void amount(double value) {
    text += ',';
    append_fixed(text, value, kAmount);
  }
  void optional(const std::optional<double>& value) {
    text += ',';
    if (value) append_fixed(text, *value, kAmount);
  }
  void phasors(const BySequence<Complex>& sequence) {
    const auto one = [&](Complex value) {
      amount(std::abs(value));
      text += ',';
      append_fixed(text, degrees(value), kAngle);
    };
    for (const Complex phase : to_phases(sequence)) one(phase);
    for (const Complex s : sequence) one(s);
  }
  void impedance(const std::optional<Complex>& z) {
    text += ',';
    if (z) append_fixed(text, z->real(), kAmount);
    text += ',';
    if (z) append_fixed(text, z->imag(), kAmount);
  }

  const Study& study_;
  CsvTable table_;
  const std::vector<std::string>& bus_fields_;
};

class CsvReport : public FaultReport {
 public:
  CsvReport(const Study& study, CsvTable table, Sink sink)
      : study_(study), table_(table), sink_(std::move(sink)) {
    for (const Bus& bus : study.network().buses) bus_fields_.push_back(csv_field(bus.id));
  }

  void begin() override {
    if (table_ == CsvTable::faults)
      sink_(
          "bus,nominal_kv,fault,current_ka,x_over_r,peak_ka,earth_current_ka,ia_ka,ia_deg,ib_ka,ib_deg,ic_ka,"
          "ic_deg,"
          "i0_ka,i0_deg,i1_ka,i1_deg,i2_ka,i2_deg,r1_ohm,x1_ohm,r2_ohm,x2_ohm,r0_ohm,x0_ohm\r\n");
    else
      sink_(
          "bus,fault,element,at_bus,ia_ka,ia_deg,ib_ka,ib_deg,ic_ka,ic_deg,i0_ka,i0_deg,i1_ka,i1_deg,i2_ka,"
          "i2_deg\r\n");
  }
  std::unique_ptr<ReportPiece> make_piece() const override {
    return std::make_unique<CsvPiece>(study_, table_, bus_fields_);
  }
  void add(ReportPiece& piece) override {
    std::string& text = static_cast<CsvPiece&>(piece).text;
    sink_(text);
    text.clear();
  }
  void end(const CrossCheck*) override {}

 private:
  const Study& study_;
  CsvTable table_;
  Sink sink_;
  std::vector<std::string> bus_fields_;
};

}  // namespace

std::unique_ptr<FaultReport> csv_report(const Study& study, CsvTable table, Sink sink) {
  return std::make_unique<CsvReport>(study, table, std::move(sink));
}

}  // namespace kiloamp
