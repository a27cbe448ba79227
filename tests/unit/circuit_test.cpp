// Sequence circuits of single elements against their closed forms.
#include "engine/sequence/circuit.hpp"

#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(circuit)

namespace {

constexpr double kRoundoff = 1e-12;
const Complex kJ(0, 1);

Transformer transformer(const std::string& group) {
  Transformer t;
  t.hv_bus = BusIndex{0};
  t.lv_bus = BusIndex{1};
  t.rated_mva = 10;
  t.hv_kv = 100;
  t.lv_kv = 10;
  t.z_percent = 10;
  t.r_percent = 0;
  t.z0_percent = 8;
  t.r0_percent = 0;
  t.vector_group = *parse_vector_group(group);
  return t;
}
const Neutral kSolid{Grounding::solid, {}, {}};

// Impedance to earth seen from one terminal with the other open.
Complex open_impedance(const Circuit& c, int s, int terminal) {
  const int other = 1 - terminal;
  const Complex coupling = c.y_siemens[s][other][other] == Complex(0)
                               ? Complex(0)
                               : c.y_siemens[s][0][1] * c.y_siemens[s][1][0] / c.y_siemens[s][other][other];
  return 1.0 / (c.y_siemens[s][terminal][terminal] - coupling);
}

}  // namespace

// Bases: 1000 ohm at 100 kV, 10 ohm at 10 kV.
BOOST_AUTO_TEST_CASE(short_circuit_impedance_is_seen_from_either_side) {
  const Circuit c = transformer_circuit(transformer("Yy0"));
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][0][0], 100.0 * kJ, kRoundoff));
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][1][1], 1.0 * kJ, kRoundoff));
  BOOST_TEST(near(c.y_siemens[kPositive][0][1] / c.y_siemens[kPositive][1][1], -0.1, kRoundoff));
}

BOOST_AUTO_TEST_CASE(tap_changes_the_ratio_and_leaves_the_other_side_s_ohms) {
  Transformer t = transformer("Yy0");
  t.tap = Tap{Side::hv, 5};
  const Circuit c = transformer_circuit(t);
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][1][1], 1.0 * kJ, kRoundoff));
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][0][0], 110.25 * kJ, 100 * kRoundoff));
}

BOOST_AUTO_TEST_CASE(delta_earths_and_star_opens_zero_sequence) {
  Transformer t = transformer("Dyn11");
  t.lv_neutral = Neutral{Grounding::impedance, 2.0, {}};
  const Circuit c = transformer_circuit(t);
  BOOST_TEST(near(1.0 / c.y_siemens[kZero][1][1], Complex(6, 0.8), kRoundoff));
  BOOST_TEST(near(c.y_siemens[kZero][0][0], 0.0, 0.0));
  BOOST_TEST(c.earthed[kZero]);
  const Circuit star = transformer_circuit(transformer("Yyn0"));
  for (int i = 0; i < 2; ++i)
    for (int j = 0; j < 2; ++j) BOOST_TEST(near(star.y_siemens[kZero][i][j], 0.0, 0.0));
}

BOOST_AUTO_TEST_CASE(magnetising_branch_is_the_path_of_a_star_without_delta) {
  Transformer t = transformer("Yyn0");
  t.lv_neutral = kSolid;
  t.zm0_percent = 60;
  const Circuit c = transformer_circuit(t);
  BOOST_TEST(near(1.0 / c.y_siemens[kZero][1][1], 6.4 * kJ, kRoundoff));  // (4 + 60) % of 10 ohm
}

BOOST_AUTO_TEST_CASE(two_earthed_stars_pass_zero_sequence_with_their_polarity) {
  for (const int clock : {0, 2, 4, 6, 8, 10}) {
    Transformer t = transformer("YNyn" + std::to_string(clock));
    t.hv_neutral = t.lv_neutral = kSolid;
    const Circuit c = transformer_circuit(t);
    const double sign = clock == 2 || clock == 6 || clock == 10 ? -1 : 1;
    BOOST_TEST(near(c.y_siemens[kZero][0][1] / c.y_siemens[kZero][1][1], -0.1 * sign, kRoundoff));
    BOOST_TEST(!c.earthed[kZero]);
  }
}

BOOST_AUTO_TEST_CASE(zigzag_is_a_path_for_its_own_side_only) {
  Transformer t = transformer("Yzn11");
  t.lv_neutral = kSolid;
  t.z0_percent = 1;
  const Circuit c = transformer_circuit(t);
  BOOST_TEST(near(1.0 / c.y_siemens[kZero][1][1], 0.1 * kJ, kRoundoff));
  BOOST_TEST(near(c.y_siemens[kZero][0][1], 0.0, 0.0));
  Transformer earthed = transformer("YNzn11");
  earthed.hv_neutral = earthed.lv_neutral = kSolid;
  BOOST_TEST(near(transformer_circuit(earthed).y_siemens[kZero][0][0], 0.0, 0.0));
  earthed.zm0_percent = 50;
  BOOST_TEST(near(1.0 / transformer_circuit(earthed).y_siemens[kZero][0][0], 550.0 * kJ, 1e-9));
}

namespace {
// Pairs on 100 MVA: 10, 20, 15 %; arms 7.5, 2.5, 12.5 %. 100/50/10 kV.
ThreeWindingTransformer three_winding(const std::string& group, bool with_lv_bus) {
  ThreeWindingTransformer t;
  t.hv_bus = BusIndex{0};
  t.mv_bus = BusIndex{1};
  if (with_lv_bus) t.lv_bus = BusIndex{2};
  t.hv_kv = 100;
  t.mv_kv = 50;
  t.lv_kv = 10;
  t.hv_mv = {100, 10, 0.0, {}, {}, 10.0, 0.0};
  t.hv_lv = {50, 10, 0.0, {}, {}, 10.0, 0.0};
  t.mv_lv = {100, 15, 0.0, {}, {}, 15.0, 0.0};
  t.vector_group = *parse_vector_group(group);
  t.hv_neutral = t.mv_neutral = kSolid;
  return t;
}
}  // namespace

BOOST_AUTO_TEST_CASE(unloaded_tertiary_leaves_the_pair) {
  const Circuit c = three_winding_circuit(three_winding("YNyn0d5", false));
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][0][0], 10.0 * kJ, kRoundoff));
  BOOST_TEST(near(1.0 / c.y_siemens[kPositive][1][1], 2.5 * kJ, kRoundoff));
  // Zero sequence from hv, mv open: arms A + C; from mv: B + C.
  BOOST_TEST(near(open_impedance(c, kZero, 0), 20.0 * kJ, 1e-9));
  BOOST_TEST(near(open_impedance(c, kZero, 1), 0.15 * 25 * kJ, 1e-9));
}

BOOST_AUTO_TEST_CASE(autotransformer_neutral_carries_the_sum_of_both_currents) {
  ThreeWindingTransformer t = three_winding("YNa0d5", false);
  t.autotransformer = true;
  t.mv_neutral.reset();
  t.hv_neutral = Neutral{Grounding::impedance, {}, 3.0};
  const Circuit c = three_winding_circuit(t);
  // hv fed, mv open: 3 Zn (the mv terminal carries nothing) on top of A + C = 20 ohm.
  BOOST_TEST(near(open_impedance(c, kZero, 0), (20.0 + 9.0) * kJ, 1e-9));
  // Open neutral: I_hv = -I_mv in amperes. With tertiary arm shorted, by ampere-turns: series path between
  // the terminals.
  t.hv_neutral = Neutral{};
  const Circuit open = three_winding_circuit(t);
  BOOST_TEST(near(open.y_siemens[kZero][0][0] + open.y_siemens[kZero][0][1], 0.0, 0.0));
  BOOST_TEST(!open.earthed[kZero]);
  BOOST_TEST(std::abs(open.y_siemens[kZero][0][0]) > 0.01);
}

// Three-phase 10 kA at 20 kV with X/R 10, earth fault 10 kA: Z0 = Z1 when the angles are equal.
BOOST_AUTO_TEST_CASE(feeder_levels_give_their_own_currents_back) {
  FeederLevel level;
  level.three_phase_ka = 10;
  level.x_over_r = 10;
  level.line_to_ground_ka = 10;
  level.x0_over_r0 = 10;
  level.z2_over_z1 = 1;
  auto z = feeder_impedance_ohm(level, 20);
  BOOST_REQUIRE(z);
  BOOST_TEST(near(*(*z)[kZero], *(*z)[kPositive], 1e-12));
  level.line_to_ground_ka = 7;
  level.x0_over_r0 = 3;
  z = feeder_impedance_ohm(level, 20);
  BOOST_REQUIRE(z);
  BOOST_TEST(near(std::sqrt(3.0) * 20 / std::abs(*(*z)[0] + *(*z)[1] + *(*z)[2]), 7.0, 1e-12));
  BOOST_TEST(near((*z)[kZero]->imag() / (*z)[kZero]->real(), 3.0, 1e-9));
  level.line_to_ground_ka = 15.1;
  BOOST_TEST(!feeder_impedance_ohm(level, 20).has_value());
}

// 7 kA at 20 kV: sqrt(3) U I = 242.49 MVA, U I / sqrt(3) = 80.83 MVA.
BOOST_AUTO_TEST_CASE(both_readings_of_an_earth_fault_mva_are_told_apart) {
  FeederLevel level;
  level.three_phase_ka = 10;
  level.x_over_r = level.x0_over_r0 = 10;
  level.line_to_ground_ka = 7;
  const auto by_current = feeder_impedance_ohm(level, 20);
  level.line_to_ground_ka.reset();
  level.line_to_ground_mva = std::sqrt(3.0) * 20 * 7;
  level.line_to_ground_mva_basis = EarthFaultMvaBasis::three_phase;
  BOOST_TEST(near(*(*feeder_impedance_ohm(level, 20))[0], *(*by_current)[0], 1e-12));
  level.line_to_ground_mva = 20 * 7 / std::sqrt(3.0);
  level.line_to_ground_mva_basis = EarthFaultMvaBasis::single_phase;
  BOOST_TEST(near(*(*feeder_impedance_ohm(level, 20))[0], *(*by_current)[0], 1e-12));
}

// Motor of 315 kW, 0.4 kV, cos phi 0.87, efficiency 95 %, LRR 6.5: S = 0.38113 MVA, |Z| = 0.16/(0.38113
// x 6.5) = 0.064586 ohm.
BOOST_AUTO_TEST_CASE(motor_impedance_from_its_nameplate) {
  InductionMotor m;
  m.rated_kw = 315;
  m.rated_kv = 0.4;
  m.power_factor = 0.87;
  m.efficiency_percent = 95;
  m.locked_rotor_ratio = 6.5;
  m.r_over_x = 0.42;
  const auto z = motor_impedance_ohm(m);
  BOOST_TEST(near(std::abs(*z[kPositive]), 0.064586, 0.5e-6));
  BOOST_TEST(near(z[kPositive]->imag() / std::abs(*z[kPositive]), 0.922,
                  0.0005));  // X = 0.922 Z, IEC 60909-0 (from memory)
  BOOST_TEST(!z[kZero].has_value());
  m.rated_kw.reset();
  m.rated_hp = 315 / 0.745699872;
  m.count = 2;
  BOOST_TEST(near(*motor_impedance_ohm(m)[kPositive] * 2.0, *z[kPositive], 1e-12));
}

BOOST_AUTO_TEST_CASE(reactor_from_percent_voltage_drop) {
  SeriesReactor r;
  r.x_percent = 5;
  r.rated_kv = 11;
  r.rated_a = 1000;
  BOOST_TEST(near(reactor_impedance_ohm(r), Complex(0, 0.05 * 11 / std::sqrt(3.0)), 1e-12));
}

BOOST_AUTO_TEST_SUITE_END()
