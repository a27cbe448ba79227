// Closed formulas of the ANSI/IEEE standards for breakers and fuses: asymmetry, factors on currents,
// capabilities.
#pragma once
#include <optional>
#include <span>

namespace kiloamp::ieee_c37 {

// X/R is that of the separate networks of reactances and resistances. Times in cycles of the power frequency
// where the name says so. Every factor is 1 at X/R 0. Sources beside each formula; all from memory.

/// Total rms over ac rms at `cycles` with the largest dc offset: sqrt(1 + 2 exp(-4 pi cycles / (X/R))).
/// Source: IEEE C37.010.
[[nodiscard]] double asymmetry(double x_over_r, double cycles);
/// The same half a cycle after the fault, sqrt(1 + 2 exp(-2 pi / (X/R))): first-cycle (momentary) current.
[[nodiscard]] double half_cycle_asymmetry(double x_over_r);
/// Crest over ac rms: sqrt(2) (1 + exp(-2 pi t / (X/R))), t = 0.49 - 0.1 exp(-(X/R) / 3) cycles.
/// Source: IEEE 551-2006.
[[nodiscard]] double crest_factor(double x_over_r);

/// What a specification asks beside the values by X/R: 1.6 (total rms) and 2.7 (crest) times the symmetrical
/// current.
inline constexpr double kMomentaryRms = 1.6, kMomentaryCrest = 2.7;

/// Contact parting time of a breaker by its rated interrupting time: 4, 3, 2, 1.5 cycles for 8, 5, 3, 2
/// cycles; empty for another rating. Source: IEEE C37.010 (half a cycle of relay time and the opening time).
[[nodiscard]] std::optional<double> parting_cycles(double interrupting_time_cycles);
/// S of a symmetrical rating by contact parting time: 1.0, 1.1, 1.2, 1.3 from 4, 3, 2, 1.5 cycles; between
/// them linear, outside as at the ends. Source: IEEE C37.04.
[[nodiscard]] double asymmetry_of_rating(double parting_cycles);

/// Remote factor of a breaker with a symmetrical rating (no ac decay): asymmetry / S, at least 1.
/// Source: IEEE C37.010, IEEE 551.
[[nodiscard]] double remote_factor(double x_over_r, double parting_cycles);
/// Remote factor of a breaker rated on total current: asymmetry itself. Source: IEEE C37.5.
[[nodiscard]] double remote_factor_total(double x_over_r, double parting_cycles);
/// Constant-kA generation: sqrt(1 + 2 exp(-2 t/tau)) / sqrt(1 + 2 exp(-2 t/tau_rated)), at least 1;
/// tau = (X/R) / (2 pi f), tau_rated 0.045 s unless the plate says another. Source: IEEE C37.010-1999.
[[nodiscard]] double constant_ka_factor(double x_over_r, double parting_s, double frequency_hz,
                                        double rated_tau_s);
/// Factor between local and remote sources: local + NACD (remote - local), NACD = remote share of the fault
/// current. Source: Huening, Interpretation of new American National Standards for power circuit breaker
/// applications, IEEE 1969; IEEE 551.
[[nodiscard]] double mixed_factor(double local, double remote, double nacd);
/// A curve of the user, linear between its points and constant beyond them; ascending in X/R, at least one
/// point.
[[nodiscard]] double curve_value(std::span<const double> x_over_r, std::span<const double> factor, double at);

/// Low-voltage devices. X/R of a test power factor: tan(arccos pf).
[[nodiscard]] double test_x_over_r(double power_factor);
/// Peak-based, at least 1: (1 + e^(-pi/(X/R))) / (1 + e^(-pi/(test X/R))). Unfused power breakers and
/// moulded-case breakers. Source: IEEE C37.13, UL 489.
[[nodiscard]] double peak_based_factor(double x_over_r, double test_x_over_r);
/// On total rms, at least 1: sqrt(1 + 2 e^(-2 pi/(X/R))) / the same at the test X/R. Fused power breakers and
/// fuses. Source: IEEE C37.13.
[[nodiscard]] double rms_based_factor(double x_over_r, double test_x_over_r);
/// Test power factor that UL 489 has for a rating: 0.50 up to 10 kA, 0.30 up to 20 kA, 0.20 above (the upper
/// end of each band, which errs to the safe side).
[[nodiscard]] double ul489_test_power_factor(double rating_ka);

/// Interrupting capability at operating voltage v.
/// Rated on total current: MVA / (sqrt(3) v), not above the rated maximum current. Source: IEEE C37.6.
[[nodiscard]] double total_current_capability_ka(double mva, double most_ka, double v_kv);
/// K-factor: I Vmax / v, not above K I; line-to-ground 1.15 times that, not above K I.
/// Source: IEEE C37.04-1964, C37.010.
[[nodiscard]] double k_factor_capability_ka(double rated_ka, double vmax_kv, double k, double v_kv,
                                            bool line_to_ground);

/// Simplified check of C37.010: E/X alone suffices when X/R is at most 17 (60 Hz; 15 in older editions) and
/// E/X within the capability, or E/X within 80 % (three-phase) or 70 % (line-to-ground) of it.
[[nodiscard]] bool simplified_check(double ex_ka, double capability_ka, double x_over_r, bool line_to_ground);

}  // namespace kiloamp::ieee_c37
