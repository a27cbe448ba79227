// Change of base: Stevenson / Grainger & Stevenson, Power System Analysis (from memory, recomputed), base 300
// MVA, 20 kV at the generator.
#include "engine/sequence/circuit.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(components)

namespace {
constexpr double kPrinted4 = 1e-4;
double per_unit(Complex z_ohm, double kv, double mva) { return z_ohm.imag() / (kv * kv / mva); }

SynchronousMachine machine(double mva, double kv, double x_percent, double x0_percent, double neutral_ohm) {
  SynchronousMachine m;
  m.rated_mva = mva;
  m.rated_kv = kv;
  m.xd_subtransient_percent = x_percent;
  m.x0_percent = x0_percent;
  m.ra_percent = 0;
  m.neutral = Neutral{Grounding::impedance, std::nullopt, neutral_ohm};
  return m;
}

Transformer transformer(double mva, double hv_kv, double lv_kv, double z_percent) {
  Transformer t;
  t.rated_mva = mva;
  t.hv_kv = hv_kv;
  t.lv_kv = lv_kv;
  t.z_percent = z_percent;
  t.r_percent = 0;
  t.vector_group = *parse_vector_group("YNd1");
  return t;
}

Line line(double km, double x1, double x0) {
  Line l;
  l.length_km = km;
  l.x1_ohm_per_km = x1;
  l.r0_ohm_per_km = 0;
  l.x0_ohm_per_km = x0;
  return l;
}
}  // namespace

BOOST_AUTO_TEST_CASE(machine_moves_to_another_base) {
  const auto z = machine_impedance_ohm(machine(500, 18, 25, 10, 0));
  BOOST_TEST(near(per_unit(*z[kPositive], 20, 100), 0.0405, 1e-12));
}

BOOST_AUTO_TEST_CASE(transformers_move_to_the_system_base) {
  const Circuit t1 = transformer_circuit(transformer(350, 230, 20, 10));
  BOOST_TEST(near(per_unit(1.0 / t1.y_siemens[kPositive][1][1], 20, 300), 0.0857, kPrinted4));
  // Three single-phase units of 100 MVA, 127/13.2 kV: 300 MVA, 220/13.2 kV. Motor base 13.8 kV.
  const Circuit t2 = transformer_circuit(transformer(300, 127 * std::sqrt(3.0), 13.2, 10));
  BOOST_TEST(near(per_unit(1.0 / t2.y_siemens[kPositive][1][1], 13.8, 300), 0.0915, kPrinted4));
  BOOST_TEST(near(per_unit(1.0 / t2.y_siemens[kPositive][0][0], 230, 300), 0.0915, kPrinted4));
}

BOOST_AUTO_TEST_CASE(line_and_motors_move_to_the_system_base) {
  const auto z_line = line_impedance_ohm(line(64, 0.5, 1.5));
  BOOST_TEST(near(per_unit(z_line[kPositive], 230, 300), 0.1815, kPrinted4));
  BOOST_TEST(near(per_unit(z_line[kZero], 230, 300), 0.5445, kPrinted4));
  BOOST_TEST(near(per_unit(*machine_impedance_ohm(machine(200, 13.2, 20, 5, 0))[kPositive], 13.8, 300),
                  0.2745, kPrinted4));
  BOOST_TEST(near(per_unit(*machine_impedance_ohm(machine(100, 13.2, 20, 5, 0))[kPositive], 13.8, 300),
                  0.5490, kPrinted4));
}

BOOST_AUTO_TEST_CASE(neutral_reactors_count_three_times) {
  const auto m1 = machine_impedance_ohm(machine(200, 13.2, 20, 5, 0)),
             m2 = machine_impedance_ohm(machine(100, 13.2, 20, 5, 0));
  BOOST_TEST(near(per_unit(*m1[kZero], 13.8, 300), 0.0686, kPrinted4));
  BOOST_TEST(near(per_unit(*m2[kZero], 13.8, 300), 0.1372, kPrinted4));
  const auto with = machine_impedance_ohm(machine(200, 13.2, 20, 5, 0.4));
  BOOST_TEST(near(per_unit(*with[kZero] - *m1[kZero], 13.8, 300), 1.890, kPrinted4 * 5));  // printed to 0.001
  const auto generator = machine_impedance_ohm(machine(300, 20, 20, 5, 0.4)),
             solid = machine_impedance_ohm(machine(300, 20, 20, 5, 0));
  BOOST_TEST(near(per_unit(*generator[kZero] - *solid[kZero], 20, 300), 0.900, 1e-12));
}

BOOST_AUTO_TEST_SUITE_END()
