// H. Saadat, Power System Analysis, example 9.1 (from memory, recomputed): three-phase fault through j0.16 pu
// at bus 3; exact.
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(saadat)

namespace {
constexpr double kExact_pu = 1e-12;
const Complex kJ(0, 1);
}  // namespace

BOOST_AUTO_TEST_CASE(fault_through_impedance_matches_example_9_1) {
  const CaseStudy study(read("tests/published/cases/three_bus.json"));
  const double base_ka = 100 / (std::sqrt(3.0) * 100), base_kv = 100 / std::sqrt(3.0);
  const auto z = study.study().solver().thevenin_pu(study.bus("3"));
  BOOST_REQUIRE(z);
  BOOST_TEST(near(z->z1, 0.34 * kJ, kExact_pu));
  const auto result = study.fault("3", FaultKind::three_phase, Complex(0, 16));
  BOOST_TEST(near(result.sequence_ka[1] / base_ka, -2.0 * kJ, kExact_pu));
  const double v[] = {0.76, 0.68, 0.32};
  const char* ids[] = {"1", "2", "3"};
  for (int i = 0; i < 3; ++i)
    BOOST_TEST(near(study.voltage_kv(result, ids[i])[1] / base_kv, v[i], kExact_pu));
  BOOST_TEST(near(study.current_ka(result, "12", "2")[0] / base_ka, -0.1 * kJ, kExact_pu));
  BOOST_TEST(near(study.current_ka(result, "13")[0] / base_ka, -1.1 * kJ, kExact_pu));
  BOOST_TEST(near(study.current_ka(result, "23")[0] / base_ka, -0.9 * kJ, kExact_pu));
  BOOST_TEST(near(study.current_ka(result, "S1", "1")[0] / base_ka, -1.2 * kJ, kExact_pu));
  BOOST_TEST(near(study.current_ka(result, "S2", "2")[0] / base_ka, -0.8 * kJ, kExact_pu));
}

BOOST_AUTO_TEST_SUITE_END()
