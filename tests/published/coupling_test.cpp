// Zero-sequence mutual coupling of two identical bussed lines, Z0 = j0.55, Z0m = j0.30 pu: closed form
// derived here, no published example.
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(coupling)

namespace {
constexpr double kExact_pu = 1e-12;
constexpr double kSource_pu = 0.10;
Complex z0_at_b(const CaseStudy& study) { return *study.study().solver().thevenin_pu(study.bus("B"))->z0; }
}  // namespace

// Same voltage across both, same current in both: (Z0 + Z0m) / 2.
BOOST_AUTO_TEST_CASE(two_lines_in_parallel) {
  const CaseStudy study(read("tests/published/cases/coupled_pair.json"));
  BOOST_TEST(near(z0_at_b(study), Complex(0, kSource_pu + 0.425), kExact_pu));
}

// 0 = Z0 I2 + Z0m I1 in the earthed line, so that Z = Z0 - Z0m^2 / Z0 and I2 = -I1 Z0m / Z0.
BOOST_AUTO_TEST_CASE(second_line_out_and_earthed) {
  StudyOptions options;
  options.scenario = 0;
  const CaseStudy study(read("tests/published/cases/coupled_pair.json"), options);
  BOOST_TEST(near(z0_at_b(study), Complex(0, kSource_pu + 0.55 - 0.30 * 0.30 / 0.55), kExact_pu));
  BOOST_TEST(near(z0_at_b(study), Complex(0, kSource_pu + 0.38636), 0.5e-5));
  // Line 1 flows into B; what enters A from line 2 went the other way, hence has the sign of line 1's current
  // at B times Z0m/Z0.
  const auto result = study.fault("B", FaultKind::line_to_ground);
  const Complex line_1 = to_sequence(study.current_ka(result, "L1"))[0];
  const Complex line_2_at_a = to_sequence(study.current_ka(result, "L2", "A"))[0];
  BOOST_TEST(near(-line_2_at_a / line_1, -0.54545, 0.5e-5));
}

// The second line out and open: no effect. Network built by taking the earthing away.
BOOST_AUTO_TEST_CASE(second_line_out_and_open) {
  Network network = read("tests/published/cases/coupled_pair.json");
  network.lines[1].earthed_when_out = false;
  StudyOptions options;
  options.scenario = 0;
  const CaseStudy study(std::move(network), options);
  BOOST_TEST(near(z0_at_b(study), Complex(0, kSource_pu + 0.55), kExact_pu));
}

// One line turned round in the file, orientation -1 with it: the same network.
BOOST_AUTO_TEST_CASE(orientation_follows_the_way_a_line_is_written) {
  Network network = read("tests/published/cases/coupled_pair.json");
  std::swap(network.lines[1].from, network.lines[1].to);
  network.mutual_couplings[0].orientation = -1;
  const CaseStudy study(std::move(network));
  BOOST_TEST(near(z0_at_b(study), Complex(0, kSource_pu + 0.425), kExact_pu));
}

BOOST_AUTO_TEST_SUITE_END()
