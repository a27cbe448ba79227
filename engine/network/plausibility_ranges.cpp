// Values that are possible but unusual. Ranges: general practice, no source, unless a line names one.
#include <cmath>

#include "engine/network/judge.hpp"

namespace kiloamp::detail {

namespace {

struct Usual {
  double low, high;
  const char* unit;
  const char* source;
};

constexpr const char* kPractice = "common practice, no source";

void within(Findings& out, ElementRef ref, const char* field, double value, const Usual& usual,
            const char* remedy) {
  if (value >= usual.low && value <= usual.high) return;
  out.remark(ref, field, number_text(value),
             "usual: " + number_text(usual.low) + " to " + number_text(usual.high) + usual.unit + " (" +
                 usual.source + ")",
             remedy);
}

void judge_feeder(Findings& out, ElementRef ref, const NetworkFeeder& f) {
  const double kv = out.network().bus(f.bus).nominal_kv;
  if (f.max.x_over_r) {
    const Usual usual = kv <= 1    ? Usual{0.5, 12, "", kPractice}
                        : kv <= 33 ? Usual{2, 25, "", kPractice}
                                   : Usual{3, 80, "", kPractice};
    within(out, ref, "max.x_over_r", *f.max.x_over_r, usual, "check whether X/R or R/X was meant");
  }
  if (f.max.three_phase_ka && f.max.line_to_ground_ka &&
      *f.max.line_to_ground_ka > 1.25 * *f.max.three_phase_ka)
    out.remark(ref, "max.line_to_ground_ka", number_text(*f.max.line_to_ground_ka),
               "usual: up to 1.25 times the three-phase level (common practice, no source)",
               "possible beside large earthed transformers; confirm with the operator");
  if (f.min && f.max.three_phase_mva && f.min->three_phase_mva &&
      *f.min->three_phase_mva > *f.max.three_phase_mva)
    out.remark(ref, "min.three_phase_mva", number_text(*f.min->three_phase_mva), "usual: not above max",
               "max and min may have changed places");
  if (f.min && f.max.three_phase_ka && f.min->three_phase_ka &&
      *f.min->three_phase_ka > *f.max.three_phase_ka)
    out.remark(ref, "min.three_phase_ka", number_text(*f.min->three_phase_ka), "usual: not above max",
               "max and min may have changed places");
}

void judge_machine(Findings& out, ElementRef ref, const SynchronousMachine& m) {
  within(out, ref, "xd_subtransient_percent", m.xd_subtransient_percent,
         {7, 40, " percent", "IEEE 141, table 4A-1, from memory"}, "check for per unit typed as percent");
  if (m.x2_percent)
    within(out, ref, "x2_percent", *m.x2_percent / m.xd_subtransient_percent,
           {0.8, 1.5, " times X\"d", kPractice}, "check the two reactances");
  if (m.x0_percent && *m.x0_percent > m.xd_subtransient_percent)
    out.remark(ref, "x0_percent", number_text(*m.x0_percent),
               "usual: below X\"d (common practice, no source)", "check the two reactances");
  if (m.xd_percent)
    within(out, ref, "xd_percent", *m.xd_percent, {80, 300, " percent", kPractice},
           "check for per unit typed as percent");
}

void judge_motor(Findings& out, ElementRef ref, const InductionMotor& m) {
  if (m.locked_rotor_ratio && !m.converter_fed.value_or(false))
    within(out, ref, "locked_rotor_ratio", *m.locked_rotor_ratio, {3.5, 9, "", kPractice},
           "give locked-rotor over rated current");
  if (m.r_over_x)
    within(out, ref, "r_over_x", *m.r_over_x, {0.02, 1, "", "IEC 60909-0, from memory"},
           "check whether X/R was meant");
}

// IEC 60076-5, minimum short-circuit impedance by rated power (from memory).
double minimum_z_percent(double mva) {
  if (mva <= 0.63) return 4;
  if (mva <= 1.25) return 5;
  if (mva <= 2.5) return 6;
  if (mva <= 6.3) return 7;
  if (mva <= 25) return 8;
  if (mva <= 40) return 10;
  if (mva <= 63) return 11;
  return 12.5;
}

void judge_transformer(Findings& out, ElementRef ref, const Transformer& t) {
  within(out, ref, "z_percent", t.z_percent,
         {0.8 * minimum_z_percent(t.rated_mva), 25, " percent", "IEC 60076-5 minimum less 20 %, from memory"},
         "check the rating that the percentage belongs to");
  if (t.z0_percent && t.vector_group.lower.size() == 1 && t.vector_group.hv == Winding::delta &&
      t.vector_group.lower[0].winding == Winding::star_neutral)
    within(out, ref, "z0_percent", *t.z0_percent / t.z_percent, {0.7, 1.1, " times z_percent", kPractice},
           "check the zero-sequence test");
}

void judge_line(Findings& out, ElementRef ref, const Line& line) {
  const double to_50_hz = 50 / out.network().frequency_hz;
  const bool cable = line.kind == LineKind::cable;
  within(out, ref, "x1_ohm_per_km", line.x1_ohm_per_km * to_50_hz,
         cable ? Usual{0.05, 0.3, " ohm/km at 50 Hz", kPractice}
               : Usual{0.2, 0.6, " ohm/km at 50 Hz", kPractice},
         "check for ohm per mile or per 1000 ft, or for the whole length");
  if (!line.x0_ohm_per_km) return;
  within(out, ref, "x0_ohm_per_km", *line.x0_ohm_per_km / line.x1_ohm_per_km,
         cable ? Usual{0.4, 6, " times x1", kPractice} : Usual{1.5, 6.5, " times x1", kPractice},
         "check the zero-sequence data");
  if (line.r0_ohm_per_km && *line.r0_ohm_per_km < line.r1_ohm_per_km)
    out.remark(ref, "r0_ohm_per_km", number_text(*line.r0_ohm_per_km),
               "usual: above r1 (common practice, no source)", "check the zero-sequence data");
}

}  // namespace

void judge_ranges(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.buses.size(); ++i)
    if (n.buses[i].prefault_pu)
      within(out, {ElementKind::bus, i}, "prefault_pu", *n.buses[i].prefault_pu,
             {0.85, 1.15, " pu", kPractice}, "give the voltage over its nominal value");
  for (std::uint32_t i = 0; i < n.network_feeders.size(); ++i)
    if (out.judges({ElementKind::network_feeder, i}))
      judge_feeder(out, {ElementKind::network_feeder, i}, n.network_feeders[i]);
  for (std::uint32_t i = 0; i < n.synchronous_machines.size(); ++i)
    if (out.judges({ElementKind::synchronous_machine, i}))
      judge_machine(out, {ElementKind::synchronous_machine, i}, n.synchronous_machines[i]);
  for (std::uint32_t i = 0; i < n.induction_motors.size(); ++i)
    if (out.judges({ElementKind::induction_motor, i}))
      judge_motor(out, {ElementKind::induction_motor, i}, n.induction_motors[i]);
  for (std::uint32_t i = 0; i < n.transformers.size(); ++i)
    if (out.judges({ElementKind::transformer, i}))
      judge_transformer(out, {ElementKind::transformer, i}, n.transformers[i]);
  for (std::uint32_t i = 0; i < n.lines.size(); ++i)
    if (out.judges({ElementKind::line, i})) judge_line(out, {ElementKind::line, i}, n.lines[i]);
  for (std::uint32_t i = 0; i < n.mutual_couplings.size(); ++i) {
    if (!out.judges({ElementKind::mutual_coupling, i})) continue;
    const MutualCoupling& c = n.mutual_couplings[i];
    const auto& x0 = n.lines[c.line_a].x0_ohm_per_km;
    if (x0)
      within(out, {ElementKind::mutual_coupling, i}, "x0m_ohm_per_km", c.x0m_ohm_per_km / *x0,
             {0.1, 0.8, " times x0", kPractice}, "check the zero-sequence data");
  }
  for (std::uint32_t i = 0; i < n.series_reactors.size(); ++i)
    if (n.series_reactors[i].x_ohm && *n.series_reactors[i].x_ohm < 0)
      out.remark({ElementKind::series_reactor, i}, "x_ohm", number_text(*n.series_reactors[i].x_ohm),
                 "usual: positive; negative is a series capacitor",
                 "confirm that it stays in during a fault");
}

}  // namespace kiloamp::detail
