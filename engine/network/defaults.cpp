#include <cmath>

#include "engine/network/finding.hpp"

namespace kiloamp {

namespace {

constexpr const char* kPractice = "common practice, no source";

// Collects uses of default rules, one entry per rule.
class Defaults {
 public:
  void use(const std::string& field, const std::string& value, const std::string& source,
           ElementRef element) {
    for (auto& entry : uses_) {
      if (entry.field == field && entry.value == value) {
        entry.elements.push_back(element);
        return;
      }
    }
    uses_.push_back({field, value, source, {element}});
  }
  std::vector<DefaultUse> take() { return std::move(uses_); }

 private:
  std::vector<DefaultUse> uses_;
};

void fill_level(FeederLevel& level, const char* which, ElementRef ref, Defaults& defaults) {
  const std::string prefix = std::string(which) + ".";
  if (level.is_outright()) {
    if (!level.x2_ohm) {
      level.r2_ohm = level.r1_ohm;
      level.x2_ohm = level.x1_ohm;
      defaults.use(prefix + "r2_ohm, x2_ohm", "as r1_ohm, x1_ohm", "IEC 60909-0, far from generators Z2 = Z1",
                   ref);
    }
    return;
  }
  if (!level.z2_over_z1) {
    level.z2_over_z1 = 1.0;
    defaults.use(prefix + "z2_over_z1", "1", "IEC 60909-0, far from generators Z2 = Z1", ref);
  }
  if ((level.line_to_ground_ka || level.line_to_ground_mva) && !level.x0_over_r0) {
    level.x0_over_r0 = level.x_over_r;
    defaults.use(prefix + "x0_over_r0", "as x_over_r", kPractice, ref);
  }
  if (level.line_to_ground_mva && !level.line_to_ground_mva_basis) {
    level.line_to_ground_mva_basis = EarthFaultMvaBasis::three_phase;
    defaults.use(prefix + "line_to_ground_mva_basis", "three_phase: S = sqrt(3) U I", kPractice, ref);
  }
}

void fill_feeders(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.network_feeders.size(); ++i) {
    NetworkFeeder& feeder = network.network_feeders[i];
    const ElementRef ref{ElementKind::network_feeder, i};
    fill_level(feeder.max, "max", ref, defaults);
    if (feeder.min) fill_level(*feeder.min, "min", ref, defaults);
  }
}

void fill_machines(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.synchronous_machines.size(); ++i) {
    SynchronousMachine& m = network.synchronous_machines[i];
    const ElementRef ref{ElementKind::synchronous_machine, i};
    if (!m.x2_percent) {
      m.x2_percent = m.xd_subtransient_percent;
      defaults.use("x2_percent", "as xd_subtransient_percent", "IEC 60909-0, X2 = X\"d", ref);
    }
    if (!m.neutral) m.neutral = Neutral{};
    if (m.neutral->grounding != Grounding::open && !m.x0_percent) {
      m.x0_percent = 0.4 * m.xd_subtransient_percent;
      defaults.use("x0_percent", "0.4 of xd_subtransient_percent",
                   "Glover, Power System Analysis and Design, table A.1: 0.05/0.12, 0.11/0.24, 0.09/0.25",
                   ref);
    }
  }
}

// R/X of a motor whose data sheet does not say. Source: IEC 60909-0:2016, 6.10 (from memory).
double motor_r_over_x(const InductionMotor& m) {
  if (m.rated_kv <= 1.0) return 0.42;
  if (!m.pole_pairs) return 0.10;
  const double mw = m.rated_kw   ? *m.rated_kw / 1000
                    : m.rated_mw ? *m.rated_mw
                                 : 0.745699872e-3 * m.rated_hp.value_or(0);
  return mw > 0 && mw / *m.pole_pairs < 1.0 ? 0.15 : 0.10;
}

void fill_motors(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.induction_motors.size(); ++i) {
    InductionMotor& m = network.induction_motors[i];
    const ElementRef ref{ElementKind::induction_motor, i};
    m.count = m.count.value_or(1);
    if (!m.pole_pairs &&
        m.speed_rpm)  // a motor turns a little slower than its field: the next whole number below
      m.pole_pairs = std::max(1, static_cast<int>(std::floor(60.0 * network.frequency_hz / *m.speed_rpm)));
    const bool drive = m.converter_fed.value_or(false);
    if (!m.locked_rotor_ratio) {
      m.locked_rotor_ratio = drive ? 3.0 : m.rated_kv <= 1.0 ? 5.0 : 6.0;
      if (drive)
        defaults.use("locked_rotor_ratio", "3 (converter-fed)", "IEC 60909-0:2016, 6.11 (from memory)", ref);
      else if (m.rated_kv <= 1.0)
        defaults.use("locked_rotor_ratio", "5 (up to 1 kV)", "IEC 60909-0:2016, 6.10 (from memory)", ref);
      else
        defaults.use("locked_rotor_ratio", "6 (above 1 kV)", "IEEE 141, motor X\" 16.7 %", ref);
    }
    if (!m.r_over_x) {
      m.r_over_x = drive ? 0.10 : motor_r_over_x(m);
      defaults.use("r_over_x",
                   *m.r_over_x == 0.42   ? "0.42 (up to 1 kV, cables included)"
                   : *m.r_over_x == 0.15 ? "0.15 (above 1 kV, below 1 MW per pole pair)"
                   : drive               ? "0.10 (converter-fed)"
                                         : "0.10 (above 1 kV)",
                   "IEC 60909-0:2016, 6.10 and 6.11 (from memory)", ref);
    }
  }
}

void fill_lines(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.lines.size(); ++i) {
    Line& line = network.lines[i];
    const ElementRef ref{ElementKind::line, i};
    line.kind = line.kind.value_or(LineKind::overhead);
    line.parallel = line.parallel.value_or(1);
    if (!line.end_temperature_c) line.end_temperature_c = 20.0;
    if (line.x0_ohm_per_km) continue;
    if (*line.kind == LineKind::overhead) {
      line.r0_ohm_per_km = line.r1_ohm_per_km + 0.148 * network.frequency_hz / 50.0;
      line.x0_ohm_per_km = 3.5 * line.x1_ohm_per_km;
      defaults.use(
          "r0_ohm_per_km, x0_ohm_per_km", "overhead: r1 + 3 pi^2 f 1e-4 ohm/km, 3.5 x1",
          "earth return resistance after Carson; X0/X1 of a single circuit, common practice, no source", ref);
    } else {
      line.r0_ohm_per_km = 4.0 * line.r1_ohm_per_km;
      line.x0_ohm_per_km = 3.5 * line.x1_ohm_per_km;
      defaults.use("r0_ohm_per_km, x0_ohm_per_km",
                   "cable: 4 r1, 3.5 x1 (return by the neutral conductor alone)",
                   "IEC 60909-2, four-core low-voltage cable (from memory)", ref);
    }
  }
}

void fill_neutral(std::optional<Neutral>& neutral, Winding winding, const char* field, ElementRef ref,
                  Defaults& defaults) {
  if (neutral) return;
  neutral = Neutral{};
  if (has_neutral(winding))
    defaults.use(field, "open: the star point is brought out but no grounding is given", kPractice, ref);
}

void fill_two_winding(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.transformers.size(); ++i) {
    Transformer& t = network.transformers[i];
    const ElementRef ref{ElementKind::transformer, i};
    const Winding hv = t.vector_group.hv, lv = t.vector_group.lower.front().winding;
    fill_neutral(t.hv_neutral, hv, "hv_neutral", ref, defaults);
    fill_neutral(t.lv_neutral, lv, "lv_neutral", ref, defaults);
    const bool zigzag = hv == Winding::zigzag_neutral || lv == Winding::zigzag_neutral;
    const bool star = hv == Winding::star_neutral || lv == Winding::star_neutral;
    if (!t.z0_percent && zigzag) {
      t.z0_percent = 0.1 * t.z_percent;
      defaults.use("z0_percent", "0.1 of z_percent (zigzag winding)", kPractice, ref);
    } else if (!t.z0_percent && star) {
      t.z0_percent = t.z_percent;
      defaults.use("z0_percent", "as z_percent", kPractice, ref);
    }
    const bool delta = hv == Winding::delta || lv == Winding::delta;
    if (!t.zm0_percent && t.core == Core::three_limb && star && !delta) {
      t.zm0_percent = 100.0;
      defaults.use("zm0_percent", "100 (three-limb core, no delta)", kPractice, ref);
    }
  }
}

void fill_three_winding(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.three_winding_transformers.size(); ++i) {
    ThreeWindingTransformer& t = network.three_winding_transformers[i];
    const ElementRef ref{ElementKind::three_winding_transformer, i};
    fill_neutral(t.hv_neutral, t.vector_group.hv, "hv_neutral", ref, defaults);
    if (!t.is_auto())
      fill_neutral(t.mv_neutral, t.vector_group.lower[0].winding, "mv_neutral", ref, defaults);
    fill_neutral(t.lv_neutral, t.vector_group.lower[1].winding, "lv_neutral", ref, defaults);
    for (auto [pair, field] :
         {std::pair{&t.hv_mv, "hv_mv.z0_percent"}, std::pair{&t.hv_lv, "hv_lv.z0_percent"},
          std::pair{&t.mv_lv, "mv_lv.z0_percent"}}) {
      if (pair->z0_percent) continue;
      pair->z0_percent = pair->z_percent;
      defaults.use(field, "as z_percent", kPractice, ref);
    }
    const bool delta = t.vector_group.lower[0].winding == Winding::delta ||
                       t.vector_group.lower[1].winding == Winding::delta;
    if (!t.zm0_percent && t.core == Core::three_limb && !delta) {
      t.zm0_percent = 100.0;
      defaults.use("zm0_percent", "100 (three-limb core, no delta)", kPractice, ref);
    }
  }
}

void fill_rest(Network& network, Defaults& defaults) {
  for (std::uint32_t i = 0; i < network.inverter_sources.size(); ++i) {
    auto& doubly_fed = network.inverter_sources[i].doubly_fed;
    if (!doubly_fed || doubly_fed->kappa) continue;
    doubly_fed->kappa = 1.7;
    defaults.use("doubly_fed.kappa", "1.7", "IEC 60909-0:2016, 6.8.3 (from memory)",
                 {ElementKind::inverter_source, i});
  }
  for (std::uint32_t i = 0; i < network.earthing_transformers.size(); ++i) {
    EarthingTransformer& e = network.earthing_transformers[i];
    if (e.neutral) continue;
    e.neutral = Neutral{Grounding::solid, {}, {}};
    defaults.use("neutral", "solid (earthing transformer)", kPractice,
                 {ElementKind::earthing_transformer, i});
  }
  for (SeriesReactor& reactor : network.series_reactors) reactor.r_ohm = reactor.r_ohm.value_or(0.0);
  for (MutualCoupling& coupling : network.mutual_couplings)
    coupling.orientation = coupling.orientation.value_or(1);
  for (Shunt& shunt : network.shunts) shunt.grounded = shunt.grounded.value_or(false);
}

}  // namespace

std::vector<DefaultUse> fill_defaults(Network& network) {
  Defaults defaults;
  fill_feeders(network, defaults);
  fill_machines(network, defaults);
  fill_motors(network, defaults);
  fill_lines(network, defaults);
  fill_two_winding(network, defaults);
  fill_three_winding(network, defaults);
  fill_rest(network, defaults);
  return defaults.take();
}

}  // namespace kiloamp
