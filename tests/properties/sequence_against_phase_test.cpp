// The sequence solution against the same faults in phase coordinates, on random networks.
#include <algorithm>

#include "engine/study/cross_check.hpp"
#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(sequence_against_phase)

namespace {
constexpr std::uint32_t kNetworks = 400;
constexpr double kAgreement = 1e-8;
}  // namespace

BOOST_AUTO_TEST_CASE(both_ways_agree_on_currents_contributions_and_voltages) {
  std::size_t faults = 0;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    BOOST_TEST_CONTEXT("seed " << seed) {
      StudyOptions options;
      options.fault.depth = static_cast<int>(seed % 3);
      options.include_shunts = seed % 4 == 0;
      if (seed % 5 == 0) options.phase_ohm = {0.3, 0.1};
      if (seed % 7 == 0) options.earth_ohm = {2.0, 0.5};
      const Study study(random_network(seed), options);
      const CrossCheck check = cross_check(study);
      faults += check.faults;
      BOOST_TEST(check.largest <= kAgreement, check.largest << " in the " << check.quantity << ", "
                                                            << fault_name(check.kind) << " at "
                                                            << study.network().bus(check.bus).id);
    }
  }
  BOOST_TEST(faults > 5000);
}

// The corrected network of IEC 60909-0 is a network like any other.
BOOST_AUTO_TEST_CASE(both_ways_agree_on_corrected_networks) {
  std::size_t faults = 0;
  for (std::uint32_t seed = 1; seed <= 120; ++seed) {
    BOOST_TEST_CONTEXT("seed " << seed) {
      StudyOptions options;
      options.method = Method::iec60909;
      options.case_kind = seed % 2 == 0 ? CaseKind::max : CaseKind::min;
      options.iec60909.edition = seed % 4 < 2 ? iec60909::Edition::e2016 : iec60909::Edition::e2001;
      Network network = random_network(seed);
      for (SynchronousMachine& m : network.synchronous_machines)
        if (!m.power_factor) m.power_factor = 0.85;
      const Study study(std::move(network), options);
      const CrossCheck check = cross_check(study);
      faults += check.faults;
      BOOST_TEST(check.largest <= kAgreement, check.largest << " in the " << check.quantity);
    }
  }
  BOOST_TEST(faults > 1500);
}

// Contributions, closed switches included, sum to the fault current in every sequence; at other buses they
// sum to nothing.
BOOST_AUTO_TEST_CASE(currents_balance_at_every_bus) {
  constexpr double kBalance = 1e-9;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    BOOST_TEST_CONTEXT("seed " << seed) {
      StudyOptions options;
      options.fault.depth = 1;
      const Study study(random_network(seed), options);
      study.for_each_fault([&](const FaultResult& result) {
        BySequence<Complex> sum{};
        for (const Contribution& c : result.contributions)
          for (int s = 0; s < 3; ++s) sum[s] += c.sequence_ka[s];
        for (int s = 0; s < 3; ++s)
          BOOST_TEST(near(sum[s], result.sequence_ka[s], kBalance * std::max(1.0, result.current_ka)));
        for (const BusVoltage& v : result.voltages) {
          if (v.bus == result.fault.bus) continue;
          BySequence<Complex> rest{};
          for (const Contribution& c : result.branch_currents)
            if (c.bus == v.bus && !(c.element.kind == ElementKind::line &&
                                    !study.network().lines[c.element.index].is_in_service()))
              for (int s = 0; s < 3; ++s) rest[s] += c.sequence_ka[s];
          const double scale =
              result.current_ka * study.model().base_ka(v.bus) / study.model().base_ka(result.fault.bus);
          for (int s = 0; s < 3; ++s) BOOST_TEST(near(rest[s], 0.0, kBalance * std::max(1.0, scale)));
        }
      });
    }
  }
}

BOOST_AUTO_TEST_SUITE_END()
