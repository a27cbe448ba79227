// Contradictions and impossible values: errors. The usual ranges are in plausibility_ranges.cpp.
#include <algorithm>
#include <cmath>

#include "engine/network/feeder_level.hpp"
#include "engine/network/judge.hpp"

namespace kiloamp {

namespace detail {

std::string number_text(double value) {
  char buffer[32];
  std::snprintf(buffer, sizeof buffer, "%.6g", value);
  return buffer;
}

}  // namespace detail

namespace {

using detail::Findings;
using detail::number_text;

constexpr double kSameVoltage = 0.01;   // two ends of a line
constexpr double kRatedVoltage = 0.30;  // rated against nominal: beyond, the wrong bus or a typing error

std::string named(const Network& n, BusIndex b) {
  return '"' + n.bus(b).id + "\" of " + number_text(n.bus(b).nominal_kv) + " kV";
}

void same_voltage(Findings& out, ElementRef ref, BusIndex from, BusIndex to) {
  const Network& n = out.network();
  if (from == to) {
    out.error(ref, "from, to", "both are \"" + n.bus(from).id + '"', "must join two different buses",
              "correct one end");
    return;
  }
  const double a = n.bus(from).nominal_kv, b = n.bus(to).nominal_kv;
  if (a > 0 && b > 0 && std::abs(a - b) > kSameVoltage * std::max(a, b))
    out.error(ref, "from, to", "joins " + named(n, from) + " and " + named(n, to),
              "both ends must have the same nominal voltage",
              "correct an end, a bus's nominal_kv, or put a transformer between them");
}

void rated_near_nominal(Findings& out, ElementRef ref, const char* field, double rated_kv, BusIndex bus) {
  const double nominal = out.network().bus(bus).nominal_kv;
  if (nominal > 0 && rated_kv > 0 && std::abs(rated_kv / nominal - 1) > kRatedVoltage)
    out.error(ref, field, number_text(rated_kv) + " at bus " + named(out.network(), bus),
              "rated and nominal voltage must agree within 30 %",
              "check the bus and the unit: kV, line to line");
}

void judge_neutral(Findings& out, ElementRef ref, const char* field, const std::optional<Neutral>& neutral,
                   bool brought_out, const std::string& winding) {
  if (!neutral) return;
  if (!brought_out) {
    out.error(ref, field, "given for " + winding,
              "only a winding with N or n in the vector group has a neutral to earth",
              "leave it out, or correct the vector group");
    return;
  }
  const bool values = neutral->r_ohm || neutral->x_ohm;
  if (neutral->grounding == Grounding::impedance && neutral->r_ohm.value_or(0) == 0 &&
      neutral->x_ohm.value_or(0) == 0)
    out.error(ref, field, "grounding \"impedance\" without r_ohm or x_ohm", "an impedance needs a value",
              "give r_ohm or x_ohm, or write \"solid\"");
  if (neutral->grounding != Grounding::impedance && values)
    out.error(ref, field,
              "an impedance with grounding \"" +
                  std::string(neutral->grounding == Grounding::solid ? "solid" : "open") + '"',
              "r_ohm and x_ohm go with \"impedance\"", "write \"impedance\", or leave the values out");
}

void judge_level(Findings& out, ElementRef ref, const std::string& name, const FeederLevel& level,
                 double nominal_kv) {
  if (level.is_outright() && level.voltage_factor)
    out.error(ref, name + ".voltage_factor", "given with impedances",
              "says at which voltage a fault level was computed; impedances need none",
              "leave it out, or give the fault level");
  if (nominal_kv <= 0 || level.is_outright() || (!level.three_phase_ka && !level.three_phase_mva) ||
      !level.x_over_r)
    return;
  const bool by_level = level.line_to_ground_ka || level.line_to_ground_mva;
  if (!by_level || feeder_impedance_ohm(level, nominal_kv)) return;
  FeederLevel other = level;
  const bool single = level.line_to_ground_mva_basis == EarthFaultMvaBasis::single_phase;
  other.line_to_ground_mva_basis =
      single ? EarthFaultMvaBasis::three_phase : EarthFaultMvaBasis::single_phase;
  const bool other_works = level.line_to_ground_mva && feeder_impedance_ohm(other, nominal_kv).has_value();
  const std::string field = name + (level.line_to_ground_ka ? ".line_to_ground_ka" : ".line_to_ground_mva");
  const std::string found =
      number_text(level.line_to_ground_ka.value_or(level.line_to_ground_mva.value_or(0))) +
      " with a three-phase level of " +
      (level.three_phase_ka ? number_text(*level.three_phase_ka) + " kA"
                            : number_text(*level.three_phase_mva) + " MVA");
  std::string remedy = "ask the grid operator what the earth-fault level means";
  if (other_works)
    remedy = std::string("read as line_to_ground_mva_basis \"") + (single ? "three_phase" : "single_phase") +
             "\" it would be physical: " + (single ? "S = sqrt(3) U I" : "S = U I / sqrt(3)");
  out.error(
      ref, field, found,
      "no zero-sequence impedance >= 0 gives this pair (line to ground stays below 1.5 times three-phase)",
      remedy);
}

void judge_sources(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.buses.size(); ++i) {
    const auto& tolerance = n.buses[i].voltage_tolerance_percent;
    if (tolerance && *tolerance != 6 && *tolerance != 10 && out.judges({ElementKind::bus, i}))
      out.error({ElementKind::bus, i}, "voltage_tolerance_percent", number_text(*tolerance),
                "IEC 60909-0 knows supplies of 6 and of 10 percent",
                "give the one that is nearer, or leave it out");
  }
  for (std::uint32_t i = 0; i < n.network_feeders.size(); ++i) {
    const NetworkFeeder& f = n.network_feeders[i];
    const ElementRef ref{ElementKind::network_feeder, i};
    if (!out.judges(ref)) continue;
    judge_level(out, ref, "max", f.max, n.bus(f.bus).nominal_kv);
    if (f.min) judge_level(out, ref, "min", *f.min, n.bus(f.bus).nominal_kv);
  }
  for (std::uint32_t i = 0; i < n.synchronous_machines.size(); ++i) {
    const SynchronousMachine& m = n.synchronous_machines[i];
    const ElementRef ref{ElementKind::synchronous_machine, i};
    if (!out.judges(ref)) continue;
    rated_near_nominal(out, ref, "rated_kv", m.rated_kv, m.bus);
    judge_neutral(out, ref, "neutral", m.neutral, true, "");
    if (m.xd_transient_percent && m.xd_subtransient_percent > *m.xd_transient_percent)
      out.error(ref, "xd_subtransient_percent, xd_transient_percent",
                number_text(m.xd_subtransient_percent) + " and " + number_text(*m.xd_transient_percent),
                "X\"d must be below X'd", "the two may have changed places");
    if (m.xd_percent && m.xd_transient_percent && *m.xd_transient_percent > *m.xd_percent)
      out.error(ref, "xd_transient_percent, xd_percent",
                number_text(*m.xd_transient_percent) + " and " + number_text(*m.xd_percent),
                "X'd must be below Xd", "the two may have changed places");
  }
  for (std::uint32_t i = 0; i < n.induction_motors.size(); ++i) {
    const InductionMotor& m = n.induction_motors[i];
    const ElementRef ref{ElementKind::induction_motor, i};
    if (!out.judges(ref)) continue;
    rated_near_nominal(out, ref, "rated_kv", m.rated_kv, m.bus);
    if (m.rated_mva && m.efficiency_percent)
      out.error(ref, "efficiency_percent", number_text(*m.efficiency_percent) + " beside rated_mva",
                "an apparent power needs no efficiency", "leave it out, or give the shaft power instead");
    if (!m.rated_mva && (!m.power_factor || !m.efficiency_percent))
      out.error(ref, !m.power_factor ? "power_factor" : "efficiency_percent", "missing",
                "a shaft power needs power_factor and efficiency_percent", "copy both from the nameplate");
    if (m.speed_rpm && *m.speed_rpm > 60 * n.frequency_hz)
      out.error(ref, "speed_rpm", number_text(*m.speed_rpm) + " at " + number_text(n.frequency_hz) + " Hz",
                "must not be above the fastest synchronous speed", "check speed and frequency");
    if (m.feeds_back && !m.converter_fed.value_or(false))
      out.error(ref, "feeds_back", "given without converter_fed", "only a converter needs it said",
                "leave it out, or set converter_fed");
  }
  for (std::uint32_t i = 0; i < n.inverter_sources.size(); ++i) {
    const InverterSource& s = n.inverter_sources[i];
    const ElementRef ref{ElementKind::inverter_source, i};
    if (!out.judges(ref)) continue;
    rated_near_nominal(out, ref, "rated_kv", s.rated_kv, s.bus);
    if (s.negative_sequence == NegativeSequence::impedance && (!s.z2_percent || !s.x2_over_r2))
      out.error(ref, "negative_sequence", "\"impedance\" without z2_percent and x2_over_r2",
                "an impedance needs both", "ask the maker, or write \"none\"");
  }
}

void judge_couplings(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.mutual_couplings.size(); ++i) {
    const MutualCoupling& c = n.mutual_couplings[i];
    const ElementRef ref{ElementKind::mutual_coupling, i};
    if (!out.judges(ref)) continue;
    if (c.line_a == c.line_b) {
      out.error(ref, "line_a, line_b", "both are \"" + n.lines[c.line_a].id + '"',
                "must be two different lines", "correct one of them");
      continue;
    }
    if (c.from_km && c.from_km->size() != 1 && c.from_km->size() != 2) continue;
    for (const auto& [which, side] : {std::pair{c.line_a, 0U}, std::pair{c.line_b, 1U}}) {
      const Line& line = n.lines[which];
      const double start = c.from_km ? (c.from_km->size() == 1 ? c.from_km->front() : (*c.from_km)[side]) : 0;
      if (line.length_km > 0 && start + c.length_km > line.length_km * (1 + 1e-9))
        out.error(ref, "length_km",
                  number_text(c.length_km) + (start > 0 ? " from km " + number_text(start) : "") +
                      ", line \"" + line.id + "\" has " + number_text(line.length_km) + " km",
                  "the coupled part must lie on both lines", "correct length_km or from_km");
      if (line.parallel.value_or(1) > 1)
        out.error(
            ref, side == 0 ? "line_a" : "line_b",
            "line \"" + line.id + "\" stands for " + std::to_string(*line.parallel) + " parallel circuits",
            "a coupled line must be a single circuit", "write each circuit as a line of its own");
      if (line.x0_ohm_per_km && c.x0m_ohm_per_km >= *line.x0_ohm_per_km)
        out.error(ref, "x0m_ohm_per_km",
                  number_text(c.x0m_ohm_per_km) + ", line \"" + line.id + "\" has x0_ohm_per_km " +
                      number_text(*line.x0_ohm_per_km),
                  "must be below the zero-sequence reactance of both lines",
                  "check the unit and whether it is ohm per km");
    }
  }
}

void judge_lines(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.lines.size(); ++i) {
    const Line& line = n.lines[i];
    const ElementRef ref{ElementKind::line, i};
    if (!out.judges(ref)) continue;
    same_voltage(out, ref, line.from, line.to);
    if (line.end_temperature_c && (*line.end_temperature_c < 20 || *line.end_temperature_c > 500))
      out.error(ref, "end_temperature_c", number_text(*line.end_temperature_c),
                "must be from 20 to 500 degrees C", "give the conductor temperature at the end of the fault");
  }
  for (std::uint32_t i = 0; i < n.series_reactors.size(); ++i)
    if (out.judges({ElementKind::series_reactor, i}))
      same_voltage(out, {ElementKind::series_reactor, i}, n.series_reactors[i].from, n.series_reactors[i].to);
  for (std::uint32_t i = 0; i < n.switches.size(); ++i)
    if (out.judges({ElementKind::bus_switch, i}))
      same_voltage(out, {ElementKind::bus_switch, i}, n.switches[i].from, n.switches[i].to);
  for (std::uint32_t i = 0; i < n.shunts.size(); ++i)
    if (out.judges({ElementKind::shunt, i}))
      rated_near_nominal(out, {ElementKind::shunt, i}, "rated_kv", n.shunts[i].rated_kv, n.shunts[i].bus);
  judge_couplings(out);
}

}  // namespace

std::vector<Finding> judge(const Network& network, const std::function<bool(ElementRef)>& skip) {
  Findings out(network, skip);
  if (network.buses.empty()) return out.take();
  judge_sources(out);
  judge_lines(out);
  detail::judge_transformers(out);
  detail::judge_devices(out);
  detail::judge_ranges(out);
  return out.take();
}

namespace detail {

void judge_winding(Findings& out, ElementRef ref, const char* field, const std::optional<Neutral>& neutral,
                   Winding winding, const std::string& name) {
  judge_neutral(out, ref, field, neutral, has_neutral(winding), name);
}
void judge_rated_voltage(Findings& out, ElementRef ref, const char* field, double rated_kv, BusIndex bus) {
  rated_near_nominal(out, ref, field, rated_kv, bus);
}

}  // namespace detail

}  // namespace kiloamp
