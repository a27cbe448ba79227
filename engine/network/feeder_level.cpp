#include "engine/network/feeder_level.hpp"

#include <cmath>

namespace kiloamp {

namespace {

using Complex = std::complex<double>;
constexpr std::size_t kZero = 0, kPositive = 1, kNegative = 2;

// Impedance of magnitude z whose reactance is x_over_r times its resistance.
Complex from_magnitude(double z, double x_over_r) { return std::polar(z, std::atan(x_over_r)); }

}  // namespace

Complex doubly_fed_impedance_ohm(double rated_kv, const DoublyFed& machine) {
  const double z =
      std::sqrt(2.0) * machine.kappa.value_or(1.7) * rated_kv / (std::sqrt(3.0) * machine.peak_ka);
  return from_magnitude(z, 1 / machine.r_over_x);
}

std::optional<SequenceImpedances> feeder_impedance_ohm(const FeederLevel& level, double nominal_kv) {
  SequenceImpedances z;
  const double c = level.voltage_factor.value_or(1.0);
  if (level.is_outright()) {
    z[kPositive] = Complex(level.r1_ohm.value_or(0), *level.x1_ohm);
    z[kNegative] =
        Complex(level.r2_ohm.value_or(level.r1_ohm.value_or(0)), level.x2_ohm.value_or(*level.x1_ohm));
    if (level.x0_ohm) z[kZero] = Complex(level.r0_ohm.value_or(0), *level.x0_ohm);
    return z;
  }
  const double z1_ohm = c * (level.three_phase_ka ? nominal_kv / (std::sqrt(3.0) * *level.three_phase_ka)
                                                  : nominal_kv * nominal_kv / *level.three_phase_mva);
  z[kPositive] = from_magnitude(z1_ohm, *level.x_over_r);
  z[kNegative] = *z[kPositive] * level.z2_over_z1.value_or(1.0);
  if (level.x0_over_x1) {
    const double x0 = *level.x0_over_x1 * z[kPositive]->imag();
    z[kZero] = Complex(level.r0_over_x0.value_or(0) * x0, x0);
    return z;
  }
  if (!level.line_to_ground_ka && !level.line_to_ground_mva) return z;
  const bool single = level.line_to_ground_mva_basis == EarthFaultMvaBasis::single_phase;
  const double i1_ka = level.line_to_ground_ka ? *level.line_to_ground_ka
                                               : *level.line_to_ground_mva / nominal_kv *
                                                     (single ? std::sqrt(3.0) : 1 / std::sqrt(3.0));
  // |Z12 + m u|^2 = total^2 with u the direction of Z0: m^2 + 2 m Re(Z12 conj u) + |Z12|^2 - total^2 = 0.
  const double total_ohm = c * std::sqrt(3.0) * nominal_kv / i1_ka;
  const Complex z12 = *z[kPositive] + *z[kNegative];
  const Complex direction = from_magnitude(1.0, level.x0_over_r0.value_or(*level.x_over_r));
  const double half_linear = (z12 * std::conj(direction)).real();
  const double discriminant = half_linear * half_linear - std::norm(z12) + total_ohm * total_ohm;
  if (discriminant < 0) return std::nullopt;
  const double m = -half_linear + std::sqrt(discriminant);
  if (!(m > 0)) return std::nullopt;
  z[kZero] = m * direction;
  return z;
}

}  // namespace kiloamp
