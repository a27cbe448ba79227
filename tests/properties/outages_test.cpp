// Single outages by change of low rank against the same network with the element really out of service.
#include "engine/study/outages.hpp"

#include <algorithm>
#include <map>

#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(outages)

namespace {

constexpr std::uint32_t kNetworks = 120;
constexpr double kAgreement = 1e-9;
const std::vector<ElementKind> kKinds{ElementKind::network_feeder,
                                      ElementKind::synchronous_machine,
                                      ElementKind::induction_motor,
                                      ElementKind::line,
                                      ElementKind::transformer,
                                      ElementKind::three_winding_transformer,
                                      ElementKind::earthing_transformer,
                                      ElementKind::series_reactor,
                                      ElementKind::shunt,
                                      ElementKind::bus_switch};

StudyOptions both_kinds(std::uint32_t seed) {
  StudyOptions options;
  options.kinds = {FaultKind::three_phase, FaultKind::line_to_ground};
  options.include_shunts = seed % 6 == 0;
  if (seed % 5 == 0) options.phase_ohm = {0.2, 0.1};
  return options;
}

// The element taken out of the network itself, and everything computed anew.
OutageCurrents really_out(Network network, ElementRef element_ref, const StudyOptions& options) {
  if (element_ref.kind == ElementKind::bus_switch)
    network.switches[element_ref.index].closed = false;
  else
    element(network, element_ref).in_service = false;
  const Study study(std::move(network), options);
  OutageCurrents currents;
  currents.three_phase_ka.resize(study.network().buses.size());
  currents.line_to_ground_ka.resize(study.network().buses.size());
  study.for_each_fault([&](const FaultResult& r) {
    (r.fault.kind == FaultKind::three_phase ? currents.three_phase_ka
                                            : currents.line_to_ground_ka)[at(r.fault.bus)] = r.current_ka;
  });
  return currents;
}

}  // namespace

BOOST_AUTO_TEST_CASE(every_single_outage_agrees_with_real_removal) {
  std::map<ElementKind, int> compared;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    BOOST_TEST_CONTEXT("seed " << seed) {
      const StudyOptions options = both_kinds(seed);
      const Network network = random_network(seed);
      const Study study(Network(network), options);
      for_each_section(network, [&](ElementKind kind, const auto& section) {
        if (std::find(kKinds.begin(), kKinds.end(), kind) == kKinds.end()) return;
        for (std::uint32_t i = 0; i < section.size(); ++i) {
          const auto fast = one_outage(study, {kind, i});
          if (!fast) continue;
          ++compared[kind];
          const OutageCurrents slow = really_out(network, {kind, i}, options);
          for (std::size_t b = 0; b < network.buses.size(); ++b) {
            const double tolerance = kAgreement * std::max(1.0, slow.three_phase_ka[b]);
            BOOST_TEST(near(fast->three_phase_ka[b], slow.three_phase_ka[b], tolerance),
                       kind_name(kind) << " " << section[i].id << " out, bus " << network.buses[b].id);
            BOOST_TEST(near(fast->line_to_ground_ka[b], slow.line_to_ground_ka[b],
                            kAgreement * std::max(1.0, slow.line_to_ground_ka[b])),
                       kind_name(kind)
                           << " " << section[i].id << " out, earth fault at bus " << network.buses[b].id);
          }
        }
      });
    }
  }
  for (const ElementKind kind : kKinds) BOOST_TEST(compared[kind] > 5, kind_name(kind));
}

BOOST_AUTO_TEST_CASE(the_table_holds_the_extremes_of_all_outages) {
  for (std::uint32_t seed = 1; seed <= 40; ++seed) {
    BOOST_TEST_CONTEXT("seed " << seed) {
      const Study study(random_network(seed), both_kinds(seed));
      OutageOptions options;
      options.kinds = kKinds;
      const OutageTable table = single_outages(study, options);
      for (const OutageRow& row : table.rows) {
        double largest = row.intact_ka, smallest = row.intact_ka;
        for_each_section(study.network(), [&](ElementKind kind, const auto& section) {
          if (std::find(kKinds.begin(), kKinds.end(), kind) == kKinds.end()) return;
          for (std::uint32_t i = 0; i < section.size(); ++i)
            if (const auto one = one_outage(study, {kind, i})) {
              const double ka = (row.kind == FaultKind::three_phase ? one->three_phase_ka
                                                                    : one->line_to_ground_ka)[at(row.bus)];
              largest = std::max(largest, ka);
              smallest = std::min(smallest, ka);
            }
        });
        BOOST_TEST(near(row.largest.current_ka, largest, kAgreement * std::max(1.0, largest)));
        BOOST_TEST(near(row.smallest.current_ka, smallest, kAgreement * std::max(1.0, largest)));
        for (const OutageExtreme* e : {&row.largest, &row.smallest}) {
          if (!e->outage) continue;
          const auto one = one_outage(study, *e->outage);
          BOOST_REQUIRE(one.has_value());
          BOOST_TEST((row.kind == FaultKind::three_phase
                          ? one->three_phase_ka
                          : one->line_to_ground_ka)[at(row.bus)] == e->current_ka);
        }
      }
    }
  }
}

BOOST_AUTO_TEST_CASE(threads_change_no_bit) {
  for (std::uint32_t seed = 1; seed <= 20; ++seed) {
    const Study study(random_network(seed), both_kinds(seed));
    OutageOptions one, three;
    three.threads = 3;
    const OutageTable a = single_outages(study, one), b = single_outages(study, three);
    BOOST_REQUIRE(a.rows.size() == b.rows.size());
    for (std::size_t r = 0; r < a.rows.size(); ++r) {
      BOOST_TEST(a.rows[r].largest.current_ka == b.rows[r].largest.current_ka);
      BOOST_TEST(a.rows[r].smallest.current_ka == b.rows[r].smallest.current_ka);
      BOOST_TEST((a.rows[r].largest.outage == b.rows[r].largest.outage));
      BOOST_TEST((a.rows[r].smallest.outage == b.rows[r].smallest.outage));
    }
  }
}

BOOST_AUTO_TEST_SUITE_END()
