#include "engine/standard/ieee_c37/formulas.hpp"
#include "reports/fault_report.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

namespace {

constexpr int kAmount = 6, kAngle = 3;
constexpr const char* kQuoted = ",\"\r\n";

}  // namespace

std::string csv_field(const std::string& text) {
  if (text.find_first_of(kQuoted) == std::string::npos) return text;
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

  void fault(const StudiedFault& studied) override {
    const FaultResult& r = studied.result;
    if (table_ == CsvTable::contributions) {
      for (const Contribution& c : r.contributions) contribution(studied, c);
      for (const Contribution& c : r.branch_currents) contribution(studied, c);
      return;
    }
    text += bus_fields_[at(r.fault.bus)];
    amount(study_.network().bus(r.fault.bus).nominal_kv);
    text += ',';
    text += fault_name(r.fault.kind);
    text += ',';
    text += case_kind_name(studied.case_kind);
    if (studied.iec60909 != nullptr) {
      iec60909_columns(*studied.iec60909);
    } else if (studied.c37 != nullptr) {
      c37_columns(*studied.c37, r);
    } else {
      amount(r.current_ka);
      optional(r.x_over_r);
      optional(r.peak_ka);
    }
    amount(std::abs(r.earth_current_ka));
    phasors(r.sequence_ka);
    impedance(r.z1_ohm);
    impedance(r.z2_ohm);
    impedance(r.z0_ohm);
    text += "\r\n";
  }

  std::string text;

 private:
  void iec60909_columns(const iec60909::Quantities& q) {
    amount(q.c);
    amount(q.ikss_ka);
    amount(q.skss_mva);
    for (const auto& value : {q.r_over_x, q.kappa, q.ip_ka, q.ib_ka, q.idc_ka, q.ib_asymmetric_ka, q.ik_ka,
                              q.m, q.n, q.ith_ka, q.i2t_ka2s})
      optional(value);
    amount(q.converter_ka);
    optional(q.motor_share_percent);
    text += ',';
    std::string missing;
    for (const auto& one : q.not_evaluated)
      missing += (missing.empty() ? "" : "; ") + one.quantity + ": " + one.why;
    text += csv_field(missing);
  }
  void c37_columns(const ieee_c37::Quantities& q, const FaultResult& r) {
    for (const ieee_c37::NetworkCurrent* n : {&q.first_cycle, &q.interrupting}) {
      amount(n->ez_ka);
      amount(n->ex_ka);
      optional(n->x_over_r);
      optional(n->complex_x_over_r);
      if (n == &q.interrupting) continue;
      optional(q.asymmetric_ka);
      amount(ieee_c37::kMomentaryRms * n->ez_ka);
      optional(q.crest_ka);
      amount(ieee_c37::kMomentaryCrest * n->ez_ka);
    }
    amount(q.nacd);
    optional(q.delayed_ka);
    const auto& xr = q.interrupting.x_over_r;
    for (const double cycles : {2.0, 3.0, 5.0, 8.0}) {
      const double parting = *ieee_c37::parting_cycles(cycles);
      optional(xr ? std::optional(ieee_c37::remote_factor(*xr, parting)) : std::nullopt);
      optional(xr ? std::optional(ieee_c37::remote_factor_total(*xr, parting)) : std::nullopt);
    }
    const auto& first = q.first_cycle.x_over_r;
    const bool low_voltage = study_.network().bus(r.fault.bus).nominal_kv <= 1;
    const auto factor = [&](double (*of)(double, double), double power_factor) {
      optional(first && low_voltage ? std::optional(of(*first, ieee_c37::test_x_over_r(power_factor)))
                                    : std::nullopt);
    };
    for (const double power_factor : {0.50, 0.30, 0.20, 0.15})
      factor(ieee_c37::peak_based_factor, power_factor);
    factor(ieee_c37::rms_based_factor, 0.20);
  }
  void contribution(const StudiedFault& studied, const Contribution& c) {
    const FaultResult& r = studied.result;
    text += bus_fields_[at(r.fault.bus)];
    text += ',';
    text += fault_name(r.fault.kind);
    text += ',';
    text += case_kind_name(studied.case_kind);
    text += ',';
    const std::string& id = element(study_.network(), c.element).id;
    if (id.find_first_of(kQuoted) == std::string::npos)
      text += id;
    else
      text += csv_field(id);
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
  CsvReport(const Studies& studies, CsvTable table, Sink sink)
      : study_(*studies.front()), table_(table), sink_(std::move(sink)) {
    for (const Bus& bus : study_.network().buses) bus_fields_.push_back(csv_field(bus.id));
  }

  void begin() override {
    if (table_ == CsvTable::faults)
      sink_(
          std::string("bus,nominal_kv,fault,case_kind,") +
          (study_.c37() != nullptr
               ? "first_cycle_ka,first_cycle_ex_ka,x_over_r,complex_x_over_r,asymmetric_ka,asymmetric_1_6_ka,"
                 "crest_ka,crest_2_7_ka,interrupting_ka,interrupting_ex_ka,interrupting_x_over_r,"
                 "interrupting_complex_x_over_r,nacd,delayed_ka,factor_2_cycle,factor_2_cycle_total,"
                 "factor_3_cycle,factor_3_cycle_total,factor_5_cycle,factor_5_cycle_total,factor_8_cycle,"
                 "factor_8_cycle_total,factor_mccb_10ka,factor_mccb_20ka,factor_mccb_above,factor_power_"
                 "breaker,"
                 "factor_fused"
           : study_.iec60909() == nullptr
               ? "current_ka,x_over_r,peak_ka"
               : "c,ikss_ka,skss_mva,r_over_x,kappa,ip_ka,ib_ka,idc_ka,ib_asymmetric_ka,ik_ka,m,n,ith_ka,"
                 "i2t_ka2s,converter_ka,motor_share_percent,not_evaluated") +
          ",earth_current_ka,ia_ka,ia_deg,ib_ka,ib_deg,ic_ka,ic_deg,i0_ka,i0_deg,i1_ka,i1_deg,i2_ka,i2_deg,"
          "r1_ohm,x1_ohm,r2_ohm,x2_ohm,r0_ohm,x0_ohm\r\n");
    else
      sink_(
          "bus,fault,case_kind,element,at_bus,ia_ka,ia_deg,ib_ka,ib_deg,ic_ka,ic_deg,i0_ka,i0_deg,i1_ka,i1_"
          "deg,i2_ka,"
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

std::unique_ptr<FaultReport> csv_report(const Studies& studies, CsvTable table, Sink sink) {
  return std::make_unique<CsvReport>(studies, table, std::move(sink));
}

}  // namespace kiloamp
