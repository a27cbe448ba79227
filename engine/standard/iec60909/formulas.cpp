#include "engine/standard/iec60909/formulas.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace kiloamp::iec60909 {

namespace {

constexpr double kPi = 3.14159265358979323846;
constexpr std::array kTimes_s{0.02, 0.05, 0.10, 0.25};

// Linear between the standard's four times, constant outside them.
double at_time(const std::array<double, 4>& values, double t_s) {
  if (t_s <= kTimes_s.front()) return values.front();
  for (std::size_t i = 1; i < kTimes_s.size(); ++i) {
    if (t_s > kTimes_s[i]) continue;
    const double part = (t_s - kTimes_s[i - 1]) / (kTimes_s[i] - kTimes_s[i - 1]);
    return values[i - 1] + part * (values[i] - values[i - 1]);
  }
  return values.back();
}

}  // namespace

double c_max(double nominal_kv, double tolerance_percent) {
  return nominal_kv <= 1 && tolerance_percent <= 6 ? 1.05 : 1.10;
}

double c_min(double nominal_kv, double tolerance_percent, Edition edition) {
  if (nominal_kv > 1) return 1.00;
  return edition == Edition::e2016 && tolerance_percent > 6 ? 0.90 : 0.95;
}

double k_t(double c_max_lv, double x_t_pu) { return 0.95 * c_max_lv / (1 + 0.6 * x_t_pu); }

double k_t_known_load(double c_max_lv, double x_t_pu, const KnownLoad& load) {
  return load.un_over_ub * c_max_lv / (1 + x_t_pu * load.ib_over_ir * load.sin_phi);
}

double k_g(double un_kv, double urg_kv, double pg, double c_max, double xd_pu, double sin_phi) {
  return un_kv / (urg_kv * (1 + pg)) * c_max / (1 + xd_pu * sin_phi);
}

double k_s(const UnitData& u) {
  const double ratio = u.unq_kv / u.urg_kv * u.urtlv_kv / u.urthv_kv;
  return ratio * ratio * u.c_max / (1 + std::abs(u.xd_pu - u.xt_pu) * u.sin_phi);
}

double k_so(const UnitData& u) {
  return u.unq_kv / (u.urg_kv * (1 + u.pg)) * u.urtlv_kv / u.urthv_kv * (1 + u.pt) * u.c_max /
         (1 + u.xd_pu * u.sin_phi);
}

InsideUnit inside_unit(const UnitData& u, bool on_load_taps) {
  const double raised = on_load_taps ? 1.0 : 1 + u.pg;
  return {u.c_max / (1 + u.xd_pu * u.sin_phi) / raised, u.c_max / (1 - u.xt_pu * u.sin_phi) / raised};
}

double fictitious_r_over_xd(double urg_kv, double srg_mva) {
  return urg_kv <= 1 ? 0.15 : srg_mva >= 100 ? 0.05 : 0.07;
}

double kappa(double r_over_x) { return 1.02 + 0.98 * std::exp(-3 * r_over_x); }

double mu(double ratio, double tmin_s) {
  if (ratio <= 2) return 1;
  const double value = at_time({0.84 + 0.26 * std::exp(-0.26 * ratio), 0.71 + 0.51 * std::exp(-0.30 * ratio),
                                0.62 + 0.72 * std::exp(-0.32 * ratio), 0.56 + 0.94 * std::exp(-0.38 * ratio)},
                               tmin_s);
  return std::min(1.0, value);
}

double q(double mw_per_pole_pair, double tmin_s) {
  const double l = std::log(mw_per_pole_pair);
  const auto kept = [](double value) { return std::clamp(value, 0.0, 1.0); };
  return at_time({kept(1.03 + 0.12 * l), kept(0.79 + 0.12 * l), kept(0.57 + 0.12 * l), kept(0.26 + 0.10 * l)},
                 tmin_s);
}

double dc_current_ka(double ik_ka, double frequency_hz, double t_s, double r_over_x) {
  return std::sqrt(2.0) * ik_ka * std::exp(-2 * kPi * frequency_hz * t_s * r_over_x);
}

std::optional<double> dc_frequency_ratio(double frequency_hz, double t_s) {
  const double cycles = frequency_hz * t_s;
  if (cycles < 1) return 0.27;
  if (cycles < 2.5) return 0.15;
  if (cycles < 5) return 0.092;
  if (cycles < 12.5) return 0.055;
  return std::nullopt;
}

double m_factor(double kappa, double frequency_hz, double tk_s) {
  if (kappa <= 1) return 0;
  const double l = std::log(kappa - 1);
  const double exponent = 2 * frequency_hz * tk_s * l;
  // Towards kappa = 2 the decay vanishes: (exp(2 x) - 1) / x has the limit 2.
  if (std::abs(exponent) < 1e-12) return 2;
  return std::expm1(2 * exponent) / exponent;
}

double n_factor(double ratio, double tk_s) {
  if (ratio <= 1) return 1;
  const double transient = ratio / (0.88 + 0.17 * ratio);  // I'k / Ik
  const double td_s = 3.1 / transient;
  const double sub = ratio - transient, tra = transient - 1;
  const double x = tk_s / td_s;
  const auto part = [&](double rate) { return -std::expm1(-rate * x) / (rate * x); };
  // I(t)/Ik = 1 + tra exp(-t/T'd) + sub exp(-10 t/T'd), squared and averaged over Tk.
  const double sum = 1 + part(20) * sub * sub + part(2) * tra * tra + 2 * part(10) * sub + 2 * part(1) * tra +
                     2 * part(11) * sub * tra;
  return sum / (ratio * ratio);
}

}  // namespace kiloamp::iec60909
