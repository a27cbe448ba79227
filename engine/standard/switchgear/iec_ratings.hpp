// What the ratings of IEC switchgear mean: dc component, peak factor, making capacity.
#pragma once

namespace kiloamp::switchgear {

// All from memory. IEC 62271-100: relay time Tr = half a cycle before the opening time; dc component of the
// rated breaking current at contact parting against the standard time constant of 45 ms, or the plate's own.

/// 100 exp(-(opening + half a cycle) / tau) percent of the crest of the ac component. Source: IEC
/// 62271-100, 4.101.
[[nodiscard]] double rated_dc_percent(double opening_time_s, double frequency_hz, double tau_s);
/// Contact parting after the start of the fault: opening time and half a cycle.
[[nodiscard]] double parting_time_s(double opening_time_s, double frequency_hz);
/// Standard time constant of the dc component, s.
inline constexpr double kStandardTau_s = 0.045;
/// Rated total rms: I sqrt(1 + 2 (dc/100)^2).
[[nodiscard]] double total_rms_ka(double symmetrical_ka, double dc_percent);

/// Peak over short-time withstand current: 2.5 at 50 Hz, 2.6 at 60 Hz for 45 ms, 2.7 for a longer time
/// constant. Source: IEC 62271-1, IEC 62271-100.
[[nodiscard]] double peak_factor(double frequency_hz, double tau_s);

/// Short-time withstand for another duration: the same current for shorter ones, equal I^2 t for longer.
/// Source: IEC 62271-1 (the rating is not exceeded for shorter times).
[[nodiscard]] double withstand_ka(double rated_ka, double rated_s, double duration_s);

/// Test class of a low-voltage breaker by its breaking capacity: power factor, and making over breaking
/// capacity. Icu up to 6 kA 0.7 and 1.5, 10 kA 0.5 and 1.7, 20 kA 0.3 and 2.0, 50 kA 0.25 and 2.1, above 0.2
/// and 2.2. Source: IEC 60947-2 table 2.
struct LowVoltageClass {
  double power_factor, making_over_breaking;
};
[[nodiscard]] LowVoltageClass low_voltage_class(double icu_ka);

}  // namespace kiloamp::switchgear
