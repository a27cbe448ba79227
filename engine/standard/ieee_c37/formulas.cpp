#include "engine/standard/ieee_c37/formulas.hpp"

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>

namespace kiloamp::ieee_c37 {

namespace {

constexpr double kPi = 3.14159265358979323846;

// e^(-a / (X/R)), 0 for a purely resistive circuit.
double decay(double a, double x_over_r) { return x_over_r > 0 ? std::exp(-a / x_over_r) : 0.0; }

double interpolated(std::span<const double> x, std::span<const double> y, double at) {
  assert(!x.empty() && x.size() == y.size());
  const auto above = std::upper_bound(x.begin(), x.end(), at);
  if (above == x.begin()) return y.front();
  if (above == x.end()) return y.back();
  const auto i = static_cast<std::size_t>(above - x.begin());
  return y[i - 1] + (y[i] - y[i - 1]) * (at - x[i - 1]) / (x[i] - x[i - 1]);
}

}  // namespace

double asymmetry(double x_over_r, double cycles) {
  return std::sqrt(1 + 2 * decay(4 * kPi * cycles, x_over_r));
}
double half_cycle_asymmetry(double x_over_r) { return asymmetry(x_over_r, 0.5); }

double crest_factor(double x_over_r) {
  const double t = 0.49 - 0.1 * std::exp(-x_over_r / 3);
  return std::sqrt(2.0) * (1 + decay(2 * kPi * t, x_over_r));
}

std::optional<double> parting_cycles(double interrupting_time_cycles) {
  constexpr std::array<std::array<double, 2>, 4> kTable{{{8, 4}, {5, 3}, {3, 2}, {2, 1.5}}};
  for (const auto& [interrupting, parting] : kTable)
    if (std::abs(interrupting - interrupting_time_cycles) < 1e-9) return parting;
  return std::nullopt;
}

double asymmetry_of_rating(double parting_cycles) {
  constexpr std::array kParting{1.5, 2.0, 3.0, 4.0}, kS{1.3, 1.2, 1.1, 1.0};
  return interpolated(kParting, kS, parting_cycles);
}

double remote_factor(double x_over_r, double parting_cycles) {
  return std::max(1.0, asymmetry(x_over_r, parting_cycles) / asymmetry_of_rating(parting_cycles));
}
double remote_factor_total(double x_over_r, double parting_cycles) {
  return asymmetry(x_over_r, parting_cycles);
}

double constant_ka_factor(double x_over_r, double parting_s, double frequency_hz, double rated_tau_s) {
  const double rated = std::sqrt(1 + 2 * std::exp(-2 * parting_s / rated_tau_s));
  return std::max(1.0, asymmetry(x_over_r, parting_s * frequency_hz) / rated);
}

double mixed_factor(double local, double remote, double nacd) { return local + nacd * (remote - local); }

double curve_value(std::span<const double> x_over_r, std::span<const double> factor, double at) {
  return interpolated(x_over_r, factor, at);
}

double test_x_over_r(double power_factor) { return std::tan(std::acos(power_factor)); }

double peak_based_factor(double x_over_r, double test) {
  return std::max(1.0, (1 + decay(kPi, x_over_r)) / (1 + decay(kPi, test)));
}
double rms_based_factor(double x_over_r, double test) {
  return std::max(1.0, half_cycle_asymmetry(x_over_r) / half_cycle_asymmetry(test));
}
double ul489_test_power_factor(double rating_ka) {
  return rating_ka <= 10 ? 0.50 : rating_ka <= 20 ? 0.30 : 0.20;
}

double total_current_capability_ka(double mva, double most_ka, double v_kv) {
  return std::min(mva / (std::sqrt(3.0) * v_kv), most_ka);
}
double k_factor_capability_ka(double rated_ka, double vmax_kv, double k, double v_kv, bool line_to_ground) {
  const double most = k * rated_ka;
  const double three_phase = std::min(rated_ka * vmax_kv / v_kv, most);
  return line_to_ground ? std::min(1.15 * three_phase, most) : three_phase;
}

bool simplified_check(double ex_ka, double capability_ka, double x_over_r, bool line_to_ground) {
  constexpr double kPlain = 17;
  const double share = line_to_ground ? 0.7 : 0.8;
  return ex_ka <= share * capability_ka || (x_over_r <= kPlain && ex_ka <= capability_ka);
}

}  // namespace kiloamp::ieee_c37
