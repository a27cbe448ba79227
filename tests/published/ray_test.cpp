// S. Ray, Electrical Power Systems, example 13.8 (read); and the transform examples of Ray, Gupta and Mehta
// (read).
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(ray)

namespace {
constexpr double kCurrent_ka = 0.05e-3;
constexpr double kVoltage_kv = 0.005;
// Line voltages printed with angles to 0.01 degree, at 13 kV: 0.0023 kV, inside the printed 0.005.
CaseStudy example() { return CaseStudy(read("tests/published/cases/single_generator.json")); }
void check_line_voltages(const CaseStudy& study, const FaultResult& result, Complex ab, Complex bc,
                         Complex ca) {
  const auto v = to_phases(study.voltage_kv(result, "TERMINALS"));
  BOOST_TEST(near(v[0] - v[1], ab, kVoltage_kv));
  BOOST_TEST(near(v[1] - v[2], bc, kVoltage_kv));
  BOOST_TEST(near(v[2] - v[0], ca, kVoltage_kv));
}
}  // namespace

BOOST_AUTO_TEST_CASE(line_to_ground_matches_example_13_8) {
  const CaseStudy study = example();
  const auto result = study.fault("TERMINALS", FaultKind::line_to_ground);
  BOOST_TEST(near(to_phases(result.sequence_ka)[0], polar_deg(10.0300, -90), kCurrent_ka));
  check_line_voltages(study, result, polar_deg(6.50, 74.39), polar_deg(12.51, -90), polar_deg(6.50, 105.61));
}

BOOST_AUTO_TEST_CASE(line_to_line_matches_example_13_8) {
  const CaseStudy study = example();
  const auto result = study.fault("TERMINALS", FaultKind::line_to_line);
  BOOST_TEST(near(to_phases(result.sequence_ka)[1], -6.83587, kCurrent_ka));
  check_line_voltages(study, result, 10.728, 0.0, -10.728);
}

BOOST_AUTO_TEST_CASE(double_line_to_ground_matches_example_13_8) {
  const CaseStudy study = example();
  const auto result = study.fault("TERMINALS", FaultKind::double_line_to_ground);
  const auto phases = to_phases(result.sequence_ka);
  BOOST_TEST(near(std::abs(phases[1]), 9.24462, kCurrent_ka));
  BOOST_TEST(near(std::arg(phases[1]) * 180 / M_PI, 135.6, 0.05));
  BOOST_TEST(near(std::abs(phases[2]), 9.24462, kCurrent_ka));
  BOOST_TEST(near(std::arg(phases[2]) * 180 / M_PI, 44.4, 0.05));
  check_line_voltages(study, result, 4.507, 0.0, -4.507);
}

// S. Ray, example 13.7: 10 at 90, 10 at -90, 10 at 0 degrees.
BOOST_AUTO_TEST_CASE(transform_matches_ray_example_13_7) {
  const auto s = to_sequence({polar_deg(10, 90), polar_deg(10, -90), 10.0});
  BOOST_TEST(near(s[0], 3.33, 0.005));
  BOOST_TEST(near(s[1], polar_deg(2.440, 60), 0.0005));
  BOOST_TEST(near(s[2], polar_deg(9.107, 120), 0.0005));
}

// Gupta et al., example 3.3.1.
BOOST_AUTO_TEST_CASE(transform_matches_gupta_example_3_3_1) {
  const auto s = to_sequence({Complex(12, 24), Complex(16, -2), Complex(-4, -6)});
  BOOST_TEST(near(s[0], Complex(8.0, 5.333), 0.0005));
  BOOST_TEST(near(s[1], Complex(0.845, 15.107), 0.00071));  // half a digit in each part
  BOOST_TEST(near(s[2], Complex(3.155, 3.560), 0.00071));
}

// V.K. Mehta, example 18.2; angles printed to 0.01 or 0.1 degree.
BOOST_AUTO_TEST_CASE(transform_matches_mehta_example_18_2) {
  const std::array<Complex, 3> phases{polar_deg(100, 30), polar_deg(50, 300), polar_deg(30, 180)};
  const auto s = to_sequence(phases);
  BOOST_TEST(near(s[0], polar_deg(27.29, 4.69), 0.0071));
  BOOST_TEST(near(s[1], polar_deg(57.98, 43.3), 0.06));
  BOOST_TEST(near(s[2], polar_deg(18.97, 24.96), 0.0071));
  BOOST_TEST(near(3.0 * s[0], polar_deg(81.88, 4.7), 0.08));
  const auto back = to_phases(s);
  for (int p = 0; p < 3; ++p) BOOST_TEST(near(back[p], phases[p], 1e-12));
}

BOOST_AUTO_TEST_SUITE_END()
