// Factors of IEC 60909-0 (from memory) against their printed values, exact waveforms and numerical
// integration.
#include "engine/standard/iec60909/formulas.hpp"

#include <cmath>

#include "tests/support/near.hpp"

using namespace kiloamp::iec60909;
using kiloamp::test::near;

BOOST_AUTO_TEST_SUITE(iec60909_formulas)

namespace {
constexpr double kPi = 3.14159265358979323846;

// Largest instant value of sin(wt + psi) - sin(psi) exp(-wt R/X), psi = alpha - phi, over time and over the
// angle alpha of closing, in units of the steady crest.
double worst_peak(double r_over_x) {
  double worst = 0;
  for (int a = 0; a <= 720; ++a) {
    const double psi = -kPi / 2 - 0.6 + a * 1.2 / 720;
    for (int t = 0; t <= 2000; ++t) {
      const double wt = 2 * kPi * t / 2000;
      worst = std::max(worst, std::abs(std::sin(wt + psi) - std::sin(psi) * std::exp(-wt * r_over_x)));
    }
  }
  return worst;
}
}  // namespace

// Values printed beside the formula in the trade's summaries: 0.05, 0.1, 0.42.
BOOST_AUTO_TEST_CASE(kappa_matches_printed_values) {
  BOOST_TEST(near(kappa(0.05), 1.8635, 0.5e-4));
  BOOST_TEST(near(kappa(0.1), 1.7460, 0.5e-4));
  BOOST_TEST(near(kappa(0.42), 1.2980, 0.5e-4));
}

// The formula is an approximation of the exact worst-angle peak: at most 1 % above and, at large R/X, 0.5 %
// below.
BOOST_AUTO_TEST_CASE(kappa_follows_the_exact_worst_angle_peak) {
  for (const double r_over_x : {0.005, 0.01, 0.02, 0.05, 0.1, 0.15, 0.2, 0.3, 0.42, 0.6, 0.8, 1.0}) {
    const double exact = worst_peak(r_over_x);
    BOOST_TEST(kappa(r_over_x) <= 1.01 * exact, "R/X " << r_over_x << " exact " << exact);
    BOOST_TEST(kappa(r_over_x) >= 0.995 * exact, "R/X " << r_over_x << " exact " << exact);
  }
  BOOST_TEST(near(worst_peak(0.05), 1.8566, 1e-4));
  BOOST_TEST(near(worst_peak(0.1), 1.7368, 1e-4));
}

BOOST_AUTO_TEST_CASE(mu_at_the_times_of_the_standard) {
  for (const double r : {2.01, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0}) {
    BOOST_TEST(near(mu(r, 0.02), std::min(1.0, 0.84 + 0.26 * std::exp(-0.26 * r)), 1e-12));
    BOOST_TEST(near(mu(r, 0.05), std::min(1.0, 0.71 + 0.51 * std::exp(-0.30 * r)), 1e-12));
    BOOST_TEST(near(mu(r, 0.10), std::min(1.0, 0.62 + 0.72 * std::exp(-0.32 * r)), 1e-12));
    BOOST_TEST(near(mu(r, 0.25), std::min(1.0, 0.56 + 0.94 * std::exp(-0.38 * r)), 1e-12));
    BOOST_TEST(mu(r, 3.0) == mu(r, 0.25));
    BOOST_TEST(near(mu(r, 0.075), (mu(r, 0.05) + mu(r, 0.10)) / 2, 1e-12));
  }
}

// The formula gives 0.9997, 0.9899, 0.9997 and 0.9996 just above 2 and the standard says 1 up to 2: the step
// is the standard's.
BOOST_AUTO_TEST_CASE(mu_steps_at_two) {
  for (const double t : {0.02, 0.05, 0.10, 0.25}) BOOST_TEST(mu(2.0, t) == 1.0);
  BOOST_TEST(near(mu(2.0 + 1e-9, 0.05), 0.71 + 0.51 * std::exp(-0.60), 1e-6));
  BOOST_TEST(mu(2.0 + 1e-9, 0.05) < 0.995);
}

BOOST_AUTO_TEST_CASE(q_at_the_times_of_the_standard_kept_between_0_and_1) {
  for (const double m : {0.05, 0.1, 0.3, 0.5, 1.0, 2.0, 3.0, 5.0}) {
    const double l = std::log(m);
    BOOST_TEST(near(q(m, 0.02), std::clamp(1.03 + 0.12 * l, 0.0, 1.0), 1e-12));
    BOOST_TEST(near(q(m, 0.05), std::clamp(0.79 + 0.12 * l, 0.0, 1.0), 1e-12));
    BOOST_TEST(near(q(m, 0.10), std::clamp(0.57 + 0.12 * l, 0.0, 1.0), 1e-12));
    BOOST_TEST(near(q(m, 0.25), std::clamp(0.26 + 0.10 * l, 0.0, 1.0), 1e-12));
  }
  BOOST_TEST(q(0.05, 0.25) == 0.0);  // the formula would give -0.04
  BOOST_TEST(q(20.0, 0.02) == 1.0);
}

// x_T 0.06 with c 1.05, and 0.125 with c 1.1.
BOOST_AUTO_TEST_CASE(transformer_factor) {
  BOOST_TEST(near(k_t(1.05, 0.06), 0.9628, 0.5e-4));
  BOOST_TEST(near(k_t(1.10, 0.125), 0.9721, 0.5e-4));
  for (const double x : {0.03, 0.06, 0.1, 0.15, 0.2}) {
    BOOST_TEST(near(k_t(1.1, x), 0.95 * 1.1 / (1 + 0.6 * x), 1e-12));
    BOOST_TEST(near(k_t_known_load(1.1, x, {1.05, 0.8, 0.6}), 1.05 * 1.1 / (1 + x * 0.8 * 0.6), 1e-12));
  }
}

// IEC TR 60909-4:2000, clause 5 (from memory, recomputed): 250 MVA, 21 kV, x"d 17 %, cos phi 0.78; 240/21 kV,
// uk 15 %; 220 kV.
BOOST_AUTO_TEST_CASE(unit_factor_with_on_load_taps) {
  const double r_t = 0.52 / 250, x_t = std::sqrt(0.15 * 0.15 - r_t * r_t);
  const UnitData unit{220, 21, 240, 21, 0.17, x_t, std::sqrt(1 - 0.78 * 0.78)};
  BOOST_TEST(near(k_s(unit), 0.912880, 1e-5));  // recomputed there with x_T = uk, here with its reactance
  BOOST_TEST(near(k_s(unit), 0.913, 0.001));
}

// The eight-node network's units and generator (IEC TR 60909-4:2000, clause 6, from memory, recomputed).
BOOST_AUTO_TEST_CASE(unit_and_generator_factors_of_the_eight_node_network) {
  const double x_t1 = std::sqrt(0.16 * 0.16 - 0.005 * 0.005);
  BOOST_TEST(near(k_s({110, 21, 115, 21, 0.14, x_t1, std::sqrt(1 - 0.85 * 0.85)}), 0.995975, 1e-6));
  UnitData s2{110, 10.5, 120, 10.5, 0.16, 0.12, std::sqrt(1 - 0.9 * 0.9)};
  s2.pg = 0.075;
  BOOST_TEST(near(k_so(s2), 0.876832, 1e-6));
  BOOST_TEST(near(k_g(10, 10.5, 0, 1.1, 0.1, 0.6), 0.988320, 1e-6));
}

// What each factor is for: multiplied out, the corrected impedance drives the current of the machine's or the
// transformer's own voltage. IEC 60909-0:2016, 6.3.3, 6.6.1, 6.7.1, 6.7.2, from memory.
BOOST_AUTO_TEST_CASE(factors_multiplied_out_at_many_points) {
  for (const double x : {0.02, 0.08, 0.15, 0.3})
    for (const double cosine : {0.7, 0.8, 0.9, 1.0})
      for (const double c : {0.95, 1.05, 1.1})
        for (const double p : {0.0, 0.05, 0.1}) {
          const double sine = std::sqrt(1 - cosine * cosine);
          BOOST_TEST(near(k_t(c, x) * (1 + 0.6 * x), 0.95 * c, 1e-14));
          BOOST_TEST(near(k_t_known_load(c, x, {0.98, 0.7, sine}) * (1 + x * 0.7 * sine), 0.98 * c, 1e-14));
          BOOST_TEST(near(k_g(10, 10.5, p, c, x, sine) * 10.5 * (1 + p) * (1 + x * sine), 10 * c, 1e-13));
          UnitData unit{110, 10.5, 115, 10, x, 0.12, sine};
          unit.c_max = c;
          const double ratio = 110 * 10 / (10.5 * 115);
          BOOST_TEST(near(k_s(unit) * (1 + std::abs(x - 0.12) * sine), ratio * ratio * c, 1e-13));
          unit.pg = p;
          for (const double pt : {-0.05, 0.0, 0.05}) {
            unit.pt = pt;
            BOOST_TEST(near(k_so(unit) * (1 + p) * (1 + x * sine), ratio * (1 + pt) * c, 1e-13));
          }
          BOOST_TEST(near(inside_unit(unit, false).generator * (1 + p) * (1 + x * sine), c, 1e-13));
          BOOST_TEST(near(inside_unit(unit, false).transformer * (1 + p) * (1 - 0.12 * sine), c, 1e-13));
        }
}

BOOST_AUTO_TEST_CASE(factors_inside_a_unit) {
  UnitData unit{110, 10.5, 120, 10.5, 0.16, 0.12, 0.6};
  unit.pg = 0.05;
  BOOST_TEST(near(inside_unit(unit, true).generator, 1.1 / (1 + 0.16 * 0.6), 1e-12));
  BOOST_TEST(near(inside_unit(unit, true).transformer, 1.1 / (1 - 0.12 * 0.6), 1e-12));
  BOOST_TEST(near(inside_unit(unit, false).generator, 1.1 / (1 + 0.16 * 0.6) / 1.05, 1e-12));
}

// Table 1.
BOOST_AUTO_TEST_CASE(voltage_factors) {
  BOOST_TEST(c_max(0.4, 6) == 1.05);
  BOOST_TEST(c_max(0.4, 10) == 1.10);
  BOOST_TEST(c_max(1.0, 6) == 1.05);
  BOOST_TEST(c_max(11, 6) == 1.10);
  BOOST_TEST(c_max(380, 10) == 1.10);
  BOOST_TEST(c_min(0.4, 6, Edition::e2016) == 0.95);
  BOOST_TEST(c_min(0.4, 10, Edition::e2016) == 0.90);
  BOOST_TEST(c_min(0.4, 10, Edition::e2001) == 0.95);
  BOOST_TEST(c_min(20, 10, Edition::e2016) == 1.00);
}

// m is the mean square of the dc component against the ac one: 2 (kappa - 1)^(4 f t) averaged over Tk, times
// 1 (i_dc/sqrt2 I)^2 * 2 / 2.
BOOST_AUTO_TEST_CASE(m_against_numerical_integration) {
  BOOST_TEST(near(m_factor(1.8, 50, 1), 0.0448, 0.5e-4));
  BOOST_TEST(near(std::sqrt(m_factor(1.8, 50, 1) + 1), 1.0222, 0.5e-4));
  for (const double k : {1.1, 1.3, 1.5, 1.7, 1.8, 1.9, 1.95}) {
    for (const double tk : {0.02, 0.05, 0.1, 0.5, 1.0, 3.0}) {
      const int steps = 20000;
      double sum = 0;
      for (int i = 0; i < steps; ++i) sum += 2 * std::pow(k - 1, 4 * 50 * (i + 0.5) * tk / steps);
      BOOST_TEST(near(m_factor(k, 50, tk), sum / steps, 1e-5), "kappa " << k << " Tk " << tk);
    }
  }
  BOOST_TEST(m_factor(1.0, 50, 1) == 0.0);
  BOOST_TEST(near(m_factor(2.0, 50, 1), 2.0, 1e-12));
}

BOOST_AUTO_TEST_CASE(n_against_numerical_integration_of_the_decay) {
  BOOST_TEST(near(n_factor(2, 1), 0.6181, 0.5e-4));
  BOOST_TEST(near(n_factor(5, 0.5), 0.3706, 0.5e-4));
  BOOST_TEST(near(n_factor(10, 3), 0.0528, 0.5e-4));
  BOOST_TEST(near(n_factor(1.25, 1), 0.8452, 0.5e-4));
  for (const double r : {1.1, 1.5, 2.0, 3.3, 5.0, 10.0}) {
    for (const double tk : {0.1, 0.5, 1.0, 3.0}) {
      const double transient = r / (0.88 + 0.17 * r), td = 3.1 / transient;
      const int steps = 20000;
      double sum = 0;
      for (int i = 0; i < steps; ++i) {
        const double t = (i + 0.5) * tk / steps;
        const double current =
            1 + (transient - 1) * std::exp(-t / td) + (r - transient) * std::exp(-10 * t / td);
        sum += current * current;
      }
      BOOST_TEST(near(n_factor(r, tk), sum / steps / (r * r), 1e-6), "I\"k/Ik " << r << " Tk " << tk);
    }
  }
  BOOST_TEST(n_factor(1, 1) == 1.0);
}

BOOST_AUTO_TEST_CASE(dc_component_by_time_and_by_the_meshed_frequencies) {
  BOOST_TEST(near(dc_current_ka(10, 50, 0, 0.1), 14.1421356, 1e-6));
  BOOST_TEST(near(dc_current_ka(10, 50, 0.01, 0.1), 14.1421356 * std::exp(-0.1 * kPi), 1e-6));
  BOOST_TEST(*dc_frequency_ratio(50, 0.01) == 0.27);
  BOOST_TEST(*dc_frequency_ratio(50, 0.02) == 0.15);
  BOOST_TEST(*dc_frequency_ratio(50, 0.05) == 0.092);
  BOOST_TEST(*dc_frequency_ratio(50, 0.10) == 0.055);
  BOOST_TEST(!dc_frequency_ratio(50, 0.25).has_value());
}

BOOST_AUTO_TEST_CASE(fictitious_resistances) {
  BOOST_TEST(fictitious_r_over_xd(21, 150) == 0.05);
  BOOST_TEST(fictitious_r_over_xd(10.5, 10) == 0.07);
  BOOST_TEST(fictitious_r_over_xd(0.4, 1) == 0.15);
}

BOOST_AUTO_TEST_SUITE_END()
