// Glover, Sarma & Overbye, Power System Analysis and Design, 5th ed., examples 9.1 to 9.5: inputs read,
// answers from memory, recomputed.
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(glover)

namespace {
const Complex kJ(0, 1);
constexpr double kPrinted = 1e-3;
constexpr double kBase_ka = 100 / (1.7320508075688772 * 13.8);
constexpr double kBase_kv = 13.8 / 1.7320508075688772;
CaseStudy example() { return CaseStudy(read("tests/published/cases/generator_line_motor.json")); }
}  // namespace

BOOST_AUTO_TEST_CASE(thevenin_impedances_match_example_9_1) {
  const CaseStudy study = example();
  const auto z = study.study().solver().thevenin_pu(study.bus("2"));
  BOOST_REQUIRE(z && z->z0);
  BOOST_TEST(near(z->z1, 0.13893 * kJ, 0.5e-5));
  BOOST_TEST(near(z->z2, 0.14562 * kJ, 0.5e-5));
  BOOST_TEST(near(*z->z0, 0.250 * kJ, 1e-9));
}

BOOST_AUTO_TEST_CASE(three_phase_current_matches_example_9_2) {
  const CaseStudy study = example();
  const auto result = study.fault("2", FaultKind::three_phase);
  BOOST_TEST(near(result.sequence_ka[1] / kBase_ka, -7.558 * kJ, kPrinted));
}

BOOST_AUTO_TEST_CASE(line_to_ground_matches_example_9_3) {
  const CaseStudy study = example();
  const auto result = study.fault("2", FaultKind::line_to_ground);
  BOOST_TEST(near(result.sequence_ka[0] / kBase_ka, -1.9643 * kJ, kPrinted));
  BOOST_TEST(near(to_phases(result.sequence_ka)[0] / kBase_ka, -5.8928 * kJ, kPrinted));
  BOOST_TEST(near(result.current_ka, 24.65, 0.005));
  const auto v = study.voltage_kv(result, "2");
  BOOST_TEST(near(v[0] / kBase_kv, -0.49106, kPrinted));
  BOOST_TEST(near(v[1] / kBase_kv, 0.77710, kPrinted));
  BOOST_TEST(near(v[2] / kBase_kv, -0.28604, kPrinted));
  const auto phases = to_phases(v);
  BOOST_TEST(near(phases[0], 0.0, 1e-9));
  BOOST_TEST(near(phases[1] / kBase_kv, polar_deg(1.179, 231.3), 1.5e-3));  // angle printed to 0.1 degree
  BOOST_TEST(near(phases[2] / kBase_kv, polar_deg(1.179, 128.7), 1.5e-3));
}

BOOST_AUTO_TEST_CASE(line_to_line_matches_example_9_4) {
  const CaseStudy study = example();
  const auto result = study.fault("2", FaultKind::line_to_line);
  BOOST_TEST(near(result.sequence_ka[1] / kBase_ka, -3.690 * kJ, kPrinted));
  BOOST_TEST(near(to_phases(result.sequence_ka)[1] / kBase_ka, -6.391, kPrinted));
  BOOST_TEST(near(result.current_ka, 26.74, 0.005));
}

BOOST_AUTO_TEST_CASE(double_line_to_ground_matches_example_9_5) {
  const CaseStudy study = example();
  const auto result = study.fault("2", FaultKind::double_line_to_ground);
  BOOST_TEST(near(result.sequence_ka[1] / kBase_ka, -4.5464 * kJ, kPrinted));
  BOOST_TEST(near(result.sequence_ka[2] / kBase_ka, 2.8730 * kJ, kPrinted));
  BOOST_TEST(near(result.sequence_ka[0] / kBase_ka, 1.6734 * kJ, kPrinted));
  const auto phases = to_phases(result.sequence_ka);
  BOOST_TEST(near(phases[1] / kBase_ka, polar_deg(6.898, 158.66), kPrinted));
  BOOST_TEST(near(phases[2] / kBase_ka, polar_deg(6.898, 21.34), kPrinted));
  BOOST_TEST(near(result.current_ka, 28.86, 0.005));
  BOOST_TEST(near(result.earth_current_ka / kBase_ka, 5.020 * kJ, kPrinted));
  BOOST_TEST(near(std::abs(result.earth_current_ka), 21.00, 0.005));
}

BOOST_AUTO_TEST_CASE(contributions_to_the_double_line_to_ground_fault_match_example_9_5) {
  const CaseStudy study = example();
  const auto result = study.fault("2", FaultKind::double_line_to_ground);
  const auto line = study.current_ka(result, "T2"), motor = study.current_ka(result, "M");
  BOOST_TEST(near(line[0] / kBase_ka, polar_deg(0.507, -90), kPrinted));
  BOOST_TEST(near(line[1] / kBase_ka, polar_deg(1.981, 172.64), kPrinted));
  BOOST_TEST(near(line[2] / kBase_ka, polar_deg(1.981, 7.36), kPrinted));
  BOOST_TEST(near(motor[0] / kBase_ka, polar_deg(0.507, 90), kPrinted));
  BOOST_TEST(near(motor[1] / kBase_ka, polar_deg(4.999, 153.17), kPrinted));
  BOOST_TEST(near(motor[2] / kBase_ka, polar_deg(4.999, 26.83), kPrinted));
}

BOOST_AUTO_TEST_SUITE_END()
