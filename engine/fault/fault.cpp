#include "engine/fault/fault.hpp"

#include <algorithm>

namespace kiloamp {

std::array<Complex, 3> to_phases(const BySequence<Complex>& s) {
  const Complex a2 = std::conj(kA);
  return {s[0] + s[1] + s[2], s[0] + a2 * s[1] + kA * s[2], s[0] + kA * s[1] + a2 * s[2]};
}

BySequence<Complex> to_sequence(const std::array<Complex, 3>& p) {
  const Complex a2 = std::conj(kA);
  return {(p[0] + p[1] + p[2]) / 3.0, (p[0] + kA * p[1] + a2 * p[2]) / 3.0,
          (p[0] + a2 * p[1] + kA * p[2]) / 3.0};
}

SequenceFault connect_sequences(FaultKind kind, const TheveninData& z, Complex e, Complex zf, Complex ze) {
  SequenceFault result;
  const Complex z1 = z.z1 + zf, z2 = z.z2 + zf;
  if (kind == FaultKind::three_phase) {
    result.loop = z1;
    result.current[kPositive] = e / z1;
    return result;
  }
  if (kind == FaultKind::line_to_ground) {
    if (!z.z0) return result;
    result.loop = z1 + z2 + *z.z0 + zf + 3.0 * ze;
    result.current.fill(e / result.loop);
    return result;
  }
  if (kind == FaultKind::line_to_line || !z.z0) {
    result.loop = z1 + z2;
    result.current[kPositive] = e / result.loop;
    result.current[kNegative] = -result.current[kPositive];
    return result;
  }
  // Z2' Z0' / (Z2' + Z0'), and each of the two parallel currents by the other's share.
  const Complex z0 = *z.z0 + zf + 3.0 * ze;
  result.loop = z1 + z2 * z0 / (z2 + z0);
  const Complex i1 = e / result.loop;
  result.current = {-i1 * z2 / (z2 + z0), i1, -i1 * z0 / (z2 + z0)};
  return result;
}

double largest_phase(const BySequence<Complex>& sequence) {
  double most = 0;
  for (const Complex phase : to_phases(sequence)) most = std::max(most, std::abs(phase));
  return most;
}

Complex earth_fault_shift_pu(FaultKind kind, const TheveninData& z, Complex e,
                             const BySequence<Complex>& current, Complex zf) {
  const Complex v1 = e - z.z1 * current[kPositive], v2 = -z.z2 * current[kNegative];
  if (kind == FaultKind::line_to_ground) return -(v1 + v2);
  return zf * to_phases(current)[1] - std::conj(kA) * v1 - kA * v2;
}

BySequence<Complex> turned(const BySequence<Complex>& value, int clock) {
  constexpr double kPi = 3.14159265358979323846;
  const Complex turn = std::polar(1.0, -kPi / 6 * clock);
  return {value[kZero], value[kPositive] * turn, value[kNegative] * std::conj(turn)};
}

}  // namespace kiloamp
