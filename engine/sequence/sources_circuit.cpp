#include <cmath>

#include "engine/sequence/circuit.hpp"

namespace kiloamp {

namespace {

constexpr double kKwPerHp = 0.745699872;

}  // namespace

Circuit shunt_circuit(BusIndex bus, const BySequence<std::optional<Complex>>& z_ohm) {
  Circuit circuit;
  circuit.terminals = 1;
  circuit.bus[0] = bus;
  for (int s = 0; s < 3; ++s) {
    circuit.group[s] = {z_ohm[s] ? 0 : -1, -1, -1};
    if (!z_ohm[s]) continue;
    circuit.y_siemens[s][0][0] = 1.0 / *z_ohm[s];
    circuit.earthed[s] = true;
  }
  return circuit;
}

std::optional<Complex> triple_neutral_ohm(const std::optional<Neutral>& neutral) {
  if (!neutral || neutral->grounding == Grounding::open) return std::nullopt;
  if (neutral->grounding == Grounding::solid) return Complex(0);
  return 3.0 * Complex(neutral->r_ohm.value_or(0), neutral->x_ohm.value_or(0));
}

BySequence<std::optional<Complex>> machine_impedance_ohm(const SynchronousMachine& m) {
  const double one_percent_ohm = m.rated_kv * m.rated_kv / m.rated_mva / 100;
  const double ra = m.ra_percent ? *m.ra_percent : m.xd_subtransient_percent / *m.x_over_r;
  BySequence<std::optional<Complex>> z;
  z[kPositive] = one_percent_ohm * Complex(ra, m.xd_subtransient_percent);
  z[kNegative] = one_percent_ohm * Complex(ra, m.x2_percent.value_or(m.xd_subtransient_percent));
  if (const auto neutral = triple_neutral_ohm(m.neutral))
    z[kZero] = one_percent_ohm * Complex(ra, m.x0_percent.value_or(0)) + *neutral;
  return z;
}

double motor_rated_mva(const InductionMotor& m) {
  const double count = m.count.value_or(1);
  if (m.rated_mva) return count * *m.rated_mva;
  const double mw = m.rated_mw ? *m.rated_mw : (m.rated_kw ? *m.rated_kw : *m.rated_hp * kKwPerHp) / 1000;
  return count * mw / (*m.power_factor * *m.efficiency_percent / 100);
}

BySequence<std::optional<Complex>> motor_impedance_ohm(const InductionMotor& m) {
  const double z_ohm = m.rated_kv * m.rated_kv / (motor_rated_mva(m) * *m.locked_rotor_ratio);
  const double x_ohm = z_ohm / std::hypot(1.0, *m.r_over_x);
  const Complex z(*m.r_over_x * x_ohm, x_ohm);
  return {std::nullopt, z, z};
}

}  // namespace kiloamp
