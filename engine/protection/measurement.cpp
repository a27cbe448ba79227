#include "engine/protection/measurement.hpp"

#include <algorithm>
#include <cmath>

namespace kiloamp {

Complex residual_compensation(Complex z1, Complex z0) { return (z0 - z1) / (3.0 * z1); }

LoopImpedances apparent_impedances(const RelayQuantities& q, Complex k0) {
  const auto i = to_phases(q.current_ka), v = to_phases(q.voltage_kv);
  const double least = kLeastLoopCurrent * std::max({std::abs(i[0]), std::abs(i[1]), std::abs(i[2])});
  const auto loop = [&](Complex voltage, Complex current) -> std::optional<Complex> {
    if (!(std::abs(current) > least)) return std::nullopt;
    return voltage / current;
  };
  const Complex residual = k0 * 3.0 * q.current_ka[kZero];
  return {loop(v[0] - v[1], i[0] - i[1]), loop(v[1] - v[2], i[1] - i[2]), loop(v[2] - v[0], i[2] - i[0]),
          loop(v[0], i[0] + residual),    loop(v[1], i[1] + residual),    loop(v[2], i[2] + residual)};
}

std::optional<Direction> direction(const RelayQuantities& q, Complex prefault_kv, double angle_rad) {
  const Complex i1 = q.current_ka[kPositive], i2 = q.current_ka[kNegative];
  const bool unbalanced = std::abs(i2) > kLeastLoopCurrent * std::abs(i1);
  const Complex polarising = unbalanced ? -q.voltage_kv[kNegative] : prefault_kv;
  const Complex operating = unbalanced ? i2 : i1;
  const Complex product = polarising * std::conj(operating) * std::polar(1.0, -angle_rad);
  if (product == Complex(0)) return std::nullopt;
  return product.real() > 0 ? Direction::forward : Direction::reverse;
}

}  // namespace kiloamp
