// Grainger & Stevenson, Power System Analysis, McGraw-Hill 1994, examples 12.1 to 12.3 (from memory,
// recomputed).
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(stevenson)

namespace {
const Complex kJ(0, 1);
// The book works with four-digit impedances: 2e-4 of a current, 3e-4 pu on voltages.
constexpr double kCurrent = 2e-4;
constexpr double kVoltage_pu = 3e-4;
constexpr double kPrinted4 = 0.5e-4;
constexpr double kBase345_ka = 100 / (1.7320508075688772 * 345);
constexpr double kBase20_kv = 20 / 1.7320508075688772;
}  // namespace

// Z-bus of the positive and the zero sequence, entries as printed to four digits.
BOOST_AUTO_TEST_CASE(driving_point_impedances_match_example_12_1) {
  const CaseStudy study(read("tests/published/cases/two_machine_line.json"));
  const double z1[] = {0.1437, 0.1696, 0.1696, 0.1437}, z0[] = {0.1553, 0.1999, 0.1999, 0.1553};
  const char* ids[] = {"1", "2", "3", "4"};
  for (int i = 0; i < 4; ++i) {
    const auto z = study.study().solver().thevenin_pu(study.bus(ids[i]));
    BOOST_REQUIRE(z && z->z0);
    BOOST_TEST(near(z->z1, kJ * z1[i], kPrinted4));
    BOOST_TEST(near(z->z2, kJ * z1[i], kPrinted4));
    BOOST_TEST(near(*z->z0, kJ * z0[i], kPrinted4));
  }
}

// Transfer impedances follow from voltage changes: V_j = 1 - Z_jk I.
BOOST_AUTO_TEST_CASE(transfer_impedances_match_example_12_1) {
  const CaseStudy study(read("tests/published/cases/two_machine_line.json"));
  const double z1[4][4] = {{0.1437, 0.1211, 0.0789, 0.0563},
                           {0.1211, 0.1696, 0.1104, 0.0789},
                           {0.0789, 0.1104, 0.1696, 0.1211},
                           {0.0563, 0.0789, 0.1211, 0.1437}};
  const double z0[4][4] = {{0.1553, 0.1407, 0.0493, 0.0347},
                           {0.1407, 0.1999, 0.0701, 0.0493},
                           {0.0493, 0.0701, 0.1999, 0.1407},
                           {0.0347, 0.0493, 0.1407, 0.1553}};
  const char* ids[] = {"1", "2", "3", "4"};
  for (int k = 0; k < 4; ++k) {
    const auto result = study.fault(ids[k], FaultKind::line_to_ground);
    const double base_ka = study.study().model().base_ka(study.bus(ids[k]));
    for (int j = 0; j < 4; ++j) {
      const double kv = study.study().model().nominal_kv[at(study.bus(ids[j]))] / std::sqrt(3.0);
      const auto v = study.voltage_kv(result, ids[j]);
      BOOST_TEST(near((1.0 - v[1] / kv) / (result.sequence_ka[1] / base_ka), kJ * z1[j][k], kPrinted4));
      BOOST_TEST(near(-v[0] / kv / (result.sequence_ka[0] / base_ka), kJ * z0[j][k], kPrinted4));
    }
  }
}

BOOST_AUTO_TEST_CASE(line_to_ground_at_bus_3_matches_example_12_1) {
  const CaseStudy study(read("tests/published/cases/two_machine_line.json"));
  const auto result = study.fault("3", FaultKind::line_to_ground);
  for (int s = 0; s < 3; ++s)
    BOOST_TEST(near(result.sequence_ka[s] / kBase345_ka, -1.8549 * kJ, 1.8549 * kCurrent));
  BOOST_TEST(near(to_phases(result.sequence_ka)[0] / kBase345_ka, -5.5648 * kJ, 5.5648 * kCurrent));
  BOOST_TEST(near(result.current_ka, 0.931, 0.0005));
  const auto v = to_phases(study.voltage_kv(result, "4"));
  BOOST_TEST(near(v[0] / kBase20_kv, 0.2898, kVoltage_pu));
  BOOST_TEST(
      near(v[1] / kBase20_kv, polar_deg(1.0187, -121.8), 2 * kVoltage_pu));  // angle printed to 0.1 degree
  BOOST_TEST(near(v[2] / kBase20_kv, polar_deg(1.0187, 121.8), 2 * kVoltage_pu));
  BOOST_TEST(near(std::abs(v[0]), 3.346, 0.0035));
  BOOST_TEST(near(std::abs(v[1]), 11.763, 0.0035));
}

BOOST_AUTO_TEST_CASE(line_to_line_at_bus_3_matches_example_12_3) {
  const CaseStudy study(read("tests/published/cases/two_machine_line.json"));
  const auto result = study.fault("3", FaultKind::line_to_line);
  BOOST_TEST(near(result.sequence_ka[1] / kBase345_ka, -2.9481 * kJ, 2.9481 * kCurrent));
  const auto phases = to_phases(result.sequence_ka);
  BOOST_TEST(near(phases[1] / kBase345_ka, -5.1061, 5.1061 * kCurrent));
  BOOST_TEST(near(result.current_ka, 0.855, 0.0005));
  const auto here = to_phases(study.voltage_kv(result, "3"));
  const double ln345_kv = 345 / std::sqrt(3.0);
  BOOST_TEST(near((here[0] - here[1]) / ln345_kv, 1.5, 1e-9));
  BOOST_TEST(near(here[1] - here[2], 0.0, 1e-9));
  BOOST_TEST(near(std::abs(here[0] - here[1]), 299.0, 0.5));
  const auto there = to_phases(study.voltage_kv(result, "4"));
  BOOST_TEST(near((there[0] - there[1]) / kBase20_kv, polar_deg(1.5203, 9.4),
                  1.5e-3));  // angle printed to 0.1 degree
  BOOST_TEST(near((there[1] - there[2]) / kBase20_kv, -0.495 * kJ, 5e-4));
  BOOST_TEST(near((there[2] - there[0]) / kBase20_kv, polar_deg(1.5203, 170.6), 1.5e-3));
  BOOST_TEST(near(std::abs(there[0] - there[1]), 17.555, 0.0035));
}

// Example 12.2: behind a star-delta transformer. The book takes the sequence voltages of 12.1; here an
// earthing transformer at bus 3 of the printed Z33(0) = 0.1999 pu gives the fault the same three impedances
// with delta-connected machine sides (assumed).
BOOST_AUTO_TEST_CASE(delta_side_voltages_match_example_12_2) {
  const CaseStudy study(read("tests/published/cases/two_machine_line_delta.json"));
  const auto result = study.fault("3", FaultKind::line_to_ground);
  const auto sequence = study.voltage_kv(result, "4");
  BOOST_TEST(near(sequence[0], 0.0, 1e-12));
  BOOST_TEST(near(sequence[1] / kBase20_kv, polar_deg(0.7754, -30), kVoltage_pu));
  BOOST_TEST(near(sequence[2] / kBase20_kv, polar_deg(-0.2246, 30), kVoltage_pu));
  const auto v = to_phases(sequence);
  BOOST_TEST(near(v[0] / kBase20_kv, Complex(0.4770, -0.5000), kVoltage_pu));
  // Recalled as b = 1.0 at 90 and c = 0.6910 at -133.7 degrees; v_b = a^2 v_1 + a v_2 of the sequence
  // voltages above gives them the other way round, and so does the wiring (phase-coordinate check): taken as
  // a slip of names in the recollection.
  BOOST_TEST(near(v[2] / kBase20_kv, kJ, kVoltage_pu));
  BOOST_TEST(near(std::abs(v[0]), 7.979, 0.0035));
  BOOST_TEST(near(std::abs(v[2]), 11.547, 0.0035));
  BOOST_TEST(near(v[1] / kBase20_kv, polar_deg(0.6910, -133.7), 2.5 * kVoltage_pu));
}

BOOST_AUTO_TEST_SUITE_END()
