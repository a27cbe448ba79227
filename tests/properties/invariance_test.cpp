// Changes that must change nothing.
#include <algorithm>
#include <map>

#include "engine/network/terminals.hpp"
#include "engine/study/study.hpp"
#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(invariance)

namespace {

constexpr std::uint32_t kNetworks = 150;
constexpr double kRoundoff = 1e-9;

using Currents = std::map<std::pair<std::string, FaultKind>, BySequence<Complex>>;
Currents currents(Network network, const StudyOptions& options = {}) {
  const Study study(std::move(network), options);
  Currents all;
  study.for_each_fault([&](const FaultResult& r) {
    all[{study.network().bus(r.fault.bus).id, r.fault.kind}] = r.sequence_ka;
  });
  return all;
}

void check_same(const Currents& a, const Currents& b) {
  BOOST_REQUIRE(a.size() == b.size());
  for (const auto& [key, value] : a) {
    const auto& other = b.at(key);
    double size = 1;
    for (const Complex s : value) size = std::max(size, std::abs(s));
    for (int s = 0; s < 3; ++s)
      BOOST_TEST(near(value[s], other[s], kRoundoff * size),
                 key.first << " " << fault_name(key.second) << " sequence " << s);
  }
}

// Turns the order of every section round and follows the references.
Network reversed(const Network& n) {
  Network r = n;
  const auto bus = [&](BusIndex& b) { b = static_cast<BusIndex>(n.buses.size() - 1 - at(b)); };
  std::reverse(r.buses.begin(), r.buses.end());
  for (auto& e : r.network_feeders) bus(e.bus);
  for (auto& e : r.synchronous_machines) bus(e.bus);
  for (auto& e : r.induction_motors) bus(e.bus);
  for (auto& e : r.lines) {
    bus(e.from);
    bus(e.to);
  }
  for (auto& e : r.transformers) {
    bus(e.hv_bus);
    bus(e.lv_bus);
  }
  for (auto& e : r.three_winding_transformers) {
    bus(e.hv_bus);
    bus(e.mv_bus);
    if (e.lv_bus) bus(*e.lv_bus);
  }
  for (auto& e : r.earthing_transformers) bus(e.bus);
  for (auto& e : r.series_reactors) {
    bus(e.from);
    bus(e.to);
  }
  for (auto& e : r.shunts) bus(e.bus);
  for (auto& e : r.switches) {
    bus(e.from);
    bus(e.to);
  }
  for (auto& c : r.mutual_couplings) {
    c.line_a = static_cast<std::uint32_t>(n.lines.size() - 1 - c.line_a);
    c.line_b = static_cast<std::uint32_t>(n.lines.size() - 1 - c.line_b);
  }
  std::reverse(r.lines.begin(), r.lines.end());
  std::reverse(r.transformers.begin(), r.transformers.end());
  std::reverse(r.network_feeders.begin(), r.network_feeders.end());
  std::reverse(r.switches.begin(), r.switches.end());
  std::reverse(r.mutual_couplings.begin(), r.mutual_couplings.end());
  return r;
}

}  // namespace

BOOST_AUTO_TEST_CASE(order_of_elements_changes_nothing) {
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) BOOST_TEST_CONTEXT("seed " << seed) {
      const Network n = random_network(seed);
      check_same(currents(n), currents(reversed(n)));
    }
}

BOOST_AUTO_TEST_CASE(base_power_changes_nothing) {
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) BOOST_TEST_CONTEXT("seed " << seed) {
      const Network n = random_network(seed);
      Network other = n;
      other.base_mva = 7.3;
      check_same(currents(n), currents(other));
    }
}

// A fault's own laws: what is faulted together is at one potential, what is not carries nothing.
BOOST_AUTO_TEST_CASE(fault_conditions_hold) {
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) BOOST_TEST_CONTEXT("seed " << seed) {
      const Study study(random_network(seed), {});
      study.for_each_fault([&](const FaultResult& r) {
        if (!r.has_source) return;
        const auto i = to_phases(r.sequence_ka), v = to_phases(r.voltages.front().sequence_kv);
        const double ka = kRoundoff * std::max(1.0, r.current_ka), kv = kRoundoff * r.prefault_kv * 10;
        switch (r.fault.kind) {
          case FaultKind::three_phase:
            for (const Complex phase : v) BOOST_TEST(near(phase, 0.0, kv));
            break;
          case FaultKind::line_to_ground:
            BOOST_TEST(near(i[1], 0.0, ka));
            BOOST_TEST(near(i[2], 0.0, ka));
            if (r.z0_ohm) BOOST_TEST(near(v[0], 0.0, kv));
            break;
          case FaultKind::line_to_line:
            BOOST_TEST(near(i[0], 0.0, ka));
            BOOST_TEST(near(i[1] + i[2], 0.0, ka));
            BOOST_TEST(near(v[1], v[2], kv));
            break;
          case FaultKind::double_line_to_ground:
            BOOST_TEST(near(i[0], 0.0, ka));
            BOOST_TEST(near(v[1], v[2], kv));
            if (r.z0_ohm) BOOST_TEST(near(v[1], 0.0, kv));
            break;
        }
      });
    }
}

BOOST_AUTO_TEST_SUITE_END()
