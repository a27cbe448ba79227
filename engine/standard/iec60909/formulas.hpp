// Closed formulas of IEC 60909-0: factors on impedances, on currents, and the decay they stand for.
#pragma once
#include <optional>

namespace kiloamp::iec60909 {

// All formulas: IEC 60909-0:2016 (clause beside each), from memory. Voltages in kV, currents in kA, powers in
// MVA or MW, times in s.

enum class Edition { e2001, e2016 };

/// Table 1. c_max: 1.05 up to 1 kV with a tolerance of +6 %, else 1.10. c_min: up to 1 kV 0.95, or in edition
/// 2016 0.90 for a tolerance of +10 %; above 1 kV 1.00. tolerance_percent is 6 or 10.
[[nodiscard]] double c_max(double nominal_kv, double tolerance_percent);
[[nodiscard]] double c_min(double nominal_kv, double tolerance_percent, Edition edition);

/// 6.3.3: K_T = 0.95 c_max / (1 + 0.6 x_T), x_T in per unit of the rating, c_max of the low-voltage side.
[[nodiscard]] double k_t(double c_max_lv, double x_t_pu);

/// What is known of a transformer's worst load before the fault.
struct KnownLoad {
  double un_over_ub;  ///< nominal over highest operating voltage
  double ib_over_ir;  ///< load current over rated current
  double sin_phi;     ///< of that load
};
/// 6.3.3: K_T = (Un/Ub) c_max / (1 + x_T (Ib/Ir) sin phi_b).
[[nodiscard]] double k_t_known_load(double c_max_lv, double x_t_pu, const KnownLoad& load);

/// 6.6.1: K_G = Un / (U_rG (1 + p_G)) c_max / (1 + x"d sin phi_rG).
[[nodiscard]] double k_g(double un_kv, double urg_kv, double pg, double c_max, double xd_pu, double sin_phi);

/// A generator with its unit transformer, as 6.7 names its quantities.
struct UnitData {
  double unq_kv;  ///< nominal voltage at the high-voltage side
  double urg_kv;  ///< rated voltage of the generator
  double urthv_kv, urtlv_kv;
  double xd_pu, xt_pu, sin_phi;
  double pg = 0;  ///< permanent deviation of the generator voltage
  double pt = 0;  ///< tap range used when the transformer has taps for off-load change
  double c_max = 1.1;
};
/// 6.7.1, on-load taps: K_S = (UnQ/UrG)^2 (UrTLV/UrTHV)^2 c_max / (1 + |x"d - x_T| sin phi).
[[nodiscard]] double k_s(const UnitData& unit);
/// 6.7.2, no on-load taps: K_SO = UnQ / (UrG (1 + pG)) (UrTLV/UrTHV) (1 +- pT) c_max / (1 + x"d sin phi).
[[nodiscard]] double k_so(const UnitData& unit);

/// Factors for a fault between generator and unit transformer (6.7.1, 6.7.2). Without on-load taps both are
/// divided by 1 + pG.
struct InsideUnit {
  double generator;    ///< K_G,S = c_max / (1 + x"d sin phi), K_G,SO
  double transformer;  ///< K_T,S = c_max / (1 - x_T sin phi), K_T,SO
};
[[nodiscard]] InsideUnit inside_unit(const UnitData& unit, bool on_load_taps);

/// 6.6.1: R_Gf / X"d for the peak: 0.05 (above 1 kV, from 100 MVA), 0.07 (above 1 kV, below), 0.15 (up to 1
/// kV).
[[nodiscard]] double fictitious_r_over_xd(double urg_kv, double srg_mva);

/// 8.1: kappa = 1.02 + 0.98 exp(-3 R/X). For R/X from 0; a network without reactance has kappa 1.02.
[[nodiscard]] double kappa(double r_over_x);

/// 9.1.2: mu of a synchronous machine; ratio = I"kG / I_rG. 1 up to a ratio of 2. Between the times of the
/// standard (0.02, 0.05, 0.10 and 0.25 s and more) interpolated linearly; below 0.02 s as at 0.02 s. At
/// most 1.
[[nodiscard]] double mu(double ratio, double tmin_s);

/// 9.1.3: q of an asynchronous motor, mw_per_pole_pair = P_rM / p. Kept within 0 and 1: the formula goes
/// below 0 for small motors.
[[nodiscard]] double q(double mw_per_pole_pair, double tmin_s);

/// 10: i_dc = sqrt(2) I"k exp(-2 pi f t R/X).
[[nodiscard]] double dc_current_ka(double ik_ka, double frequency_hz, double t_s, double r_over_x);
/// 10: equivalent frequency f_c / f for a meshed network: 0.27 for f t < 1, 0.15 < 2.5, 0.092 < 5, 0.055
/// < 12.5. Empty beyond.
[[nodiscard]] std::optional<double> dc_frequency_ratio(double frequency_hz, double t_s);

/// Annex A: m of the dc part, m = (exp(4 f Tk ln(kappa - 1)) - 1) / (2 f Tk ln(kappa - 1)); 0 for kappa up to
/// 1 (and its limits).
[[nodiscard]] double m_factor(double kappa, double frequency_hz, double tk_s);
/// Annex A: n of the ac part; ratio = I"k / Ik. 1 when the ratio is 1 (far from generators).
[[nodiscard]] double n_factor(double ratio, double tk_s);

}  // namespace kiloamp::iec60909
