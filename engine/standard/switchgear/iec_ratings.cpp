#include "engine/standard/switchgear/iec_ratings.hpp"

#include <cmath>

namespace kiloamp::switchgear {

double parting_time_s(double opening_time_s, double frequency_hz) {
  return opening_time_s + 0.5 / frequency_hz;
}

double rated_dc_percent(double opening_time_s, double frequency_hz, double tau_s) {
  return 100 * std::exp(-parting_time_s(opening_time_s, frequency_hz) / tau_s);
}

double total_rms_ka(double symmetrical_ka, double dc_percent) {
  const double dc = dc_percent / 100;
  return symmetrical_ka * std::sqrt(1 + 2 * dc * dc);
}

double peak_factor(double frequency_hz, double tau_s) {
  if (tau_s > kStandardTau_s) return 2.7;
  return frequency_hz < 55 ? 2.5 : 2.6;
}

double withstand_ka(double rated_ka, double rated_s, double duration_s) {
  return duration_s <= rated_s ? rated_ka : rated_ka * std::sqrt(rated_s / duration_s);
}

LowVoltageClass low_voltage_class(double icu_ka) {
  if (icu_ka <= 6) return {0.7, 1.5};
  if (icu_ka <= 10) return {0.5, 1.7};
  if (icu_ka <= 20) return {0.3, 2.0};
  if (icu_ka <= 50) return {0.25, 2.1};
  return {0.2, 2.2};
}

}  // namespace kiloamp::switchgear
