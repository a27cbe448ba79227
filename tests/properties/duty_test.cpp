// What flows through a device, on every network.
#include <algorithm>

#include "engine/network/terminals.hpp"
#include "engine/study/duty.hpp"
#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(duty_laws)

namespace {

constexpr double kAgreement = 1e-9;  // relative
constexpr std::uint32_t kNetworks = 60;

struct Place {
  ElementRef branch;
  BusIndex* bus;  // the terminal, in the network at hand
};

// Every terminal of everything that a device may stand on.
std::vector<Place> places(Network& n) {
  std::vector<Place> all;
  const auto add = [&](ElementKind kind, std::size_t i, BusIndex& bus) {
    all.push_back({{kind, static_cast<std::uint32_t>(i)}, &bus});
  };
  for (std::size_t i = 0; i < n.network_feeders.size(); ++i)
    add(ElementKind::network_feeder, i, n.network_feeders[i].bus);
  for (std::size_t i = 0; i < n.synchronous_machines.size(); ++i)
    add(ElementKind::synchronous_machine, i, n.synchronous_machines[i].bus);
  for (std::size_t i = 0; i < n.induction_motors.size(); ++i)
    add(ElementKind::induction_motor, i, n.induction_motors[i].bus);
  for (std::size_t i = 0; i < n.lines.size(); ++i) {
    add(ElementKind::line, i, n.lines[i].from);
    add(ElementKind::line, i, n.lines[i].to);
  }
  for (std::size_t i = 0; i < n.transformers.size(); ++i) {
    add(ElementKind::transformer, i, n.transformers[i].hv_bus);
    add(ElementKind::transformer, i, n.transformers[i].lv_bus);
  }
  for (std::size_t i = 0; i < n.three_winding_transformers.size(); ++i) {
    ThreeWindingTransformer& t = n.three_winding_transformers[i];
    add(ElementKind::three_winding_transformer, i, t.hv_bus);
    add(ElementKind::three_winding_transformer, i, t.mv_bus);
    if (t.lv_bus) add(ElementKind::three_winding_transformer, i, *t.lv_bus);
  }
  for (std::size_t i = 0; i < n.series_reactors.size(); ++i) {
    add(ElementKind::series_reactor, i, n.series_reactors[i].from);
    add(ElementKind::series_reactor, i, n.series_reactors[i].to);
  }
  return all;
}

bool is_in_the_network(const Network& n, const Place& place) {
  if (!element(n, place.branch).is_in_service()) return false;
  const auto buses = buses_of(n, place.branch);
  const bool live =
      std::all_of(buses.begin(), buses.end(), [&](BusIndex b) { return n.bus(b).is_in_service(); });
  return live && (place.branch.kind != ElementKind::induction_motor ||
                  n.induction_motors[place.branch.index].drives_fault_current());
}

Network network_of(std::uint32_t seed) {
  Network n = random_network(seed);
  for (SynchronousMachine& m : n.synchronous_machines)
    if (!m.power_factor) m.power_factor = 0.85;
  n.scenarios.clear();
  return n;
}

// A device whose duty is the current through it, without any factor.
Breaker plain_device(DeviceFamily family, BusIndex bus, ElementRef branch) {
  Breaker d;
  d.id = "D";
  d.bus = bus;
  d.branch = branch;
  d.standard = family == DeviceFamily::iec ? DeviceStandard::iec60269 : DeviceStandard::c37_20;
  d.rated_kv = 1000;
  d.breaking_ka = d.short_time_ka = d.peak_withstand_ka = 1000;
  return d;
}

StudyOptions study_options(DeviceFamily family) {
  StudyOptions options;
  options.method = family == DeviceFamily::iec ? Method::iec60909 : Method::c37;
  return options;
}

// The branch's terminal on a bus of its own behind a closed switch: the current in the switch for faults at
// either of its ends, largest over kinds.
double through_a_switch(Network n, std::size_t place, DeviceFamily family) {
  Bus bus = n.bus(*places(n)[place].bus);
  bus.id = "behind the switch";
  const BusIndex here = *places(n)[place].bus, there{static_cast<std::uint32_t>(n.buses.size())};
  n.buses.push_back(bus);
  *places(n)[place].bus = there;
  BusSwitch s;
  s.id = "switch of the test";
  s.from = here;
  s.to = there;
  n.switches.push_back(s);
  const ElementRef ref{ElementKind::bus_switch, static_cast<std::uint32_t>(n.switches.size() - 1)};
  StudyOptions options = study_options(family);
  options.buses = {here, there};
  const Study study(std::move(n), options);
  double most = 0;
  study.for_each_fault([&](const StudiedFault& fault) {
    for (const Contribution& c : fault.result.contributions)
      if (c.element == ref) most = std::max(most, largest_phase(c.sequence_ka));
  });
  return most;
}

const DutyCheck& through_check(const DutyTable& table, DeviceFamily family) {
  const auto& checks = table.devices.at(0).checks;
  return *std::find_if(checks.begin(), checks.end(), [&](const DutyCheck& c) {
    return c.quantity == (family == DeviceFamily::iec ? DutyQuantity::breaking : DutyQuantity::short_time);
  });
}

}  // namespace

BOOST_AUTO_TEST_CASE(current_through_a_device_is_that_through_a_switch_in_its_place) {
  std::size_t compared = 0, own = 0, opened = 0;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    Network n = network_of(seed);
    const std::size_t count = places(n).size();
    for (std::size_t p = seed % 3; p < count; p += 3) {
      for (const DeviceFamily family : {DeviceFamily::iec, DeviceFamily::ansi}) {
        const Place place = places(n)[p];
        if (!is_in_the_network(n, place)) continue;  // a device before a dead branch carries nothing
        Network judged = n;
        judged.breakers = {plain_device(family, *place.bus, place.branch)};
        judged.fuses.clear();
        judged.switchboards.clear();
        const DutyCheck check = through_check(duty(judged, {}), family);
        const double expected = through_a_switch(n, p, family);
        BOOST_TEST_CONTEXT("seed " << seed << ", " << element(n, place.branch).id << " at "
                                   << n.bus(*place.bus).id) {
          BOOST_TEST(near(check.through_ka, expected, kAgreement * std::max(1.0, expected)));
          ++compared;
          if (expected > 0 && check.side == DutySide::own) ++own;
          // A source opened changes nothing for the others when the bus is at no voltage: three-phase.
          const bool source = place.branch.kind == ElementKind::network_feeder ||
                              place.branch.kind == ElementKind::synchronous_machine ||
                              place.branch.kind == ElementKind::induction_motor;
          if (!source || check.kind != FaultKind::three_phase || check.side != DutySide::beyond ||
              expected == 0)
            continue;
          Network without = n;
          element(without, place.branch).in_service = false;
          if (place.branch.kind == ElementKind::synchronous_machine)
            for (PowerStationUnit& u : without.power_station_units)
              if (u.machine == place.branch.index) u.in_service = true;
          if (!without.power_station_units.empty() && family == DeviceFamily::iec)
            continue;  // without its machine a unit's transformer has another factor
          StudyOptions options = study_options(family);
          options.buses = {*place.bus};
          options.kinds = {FaultKind::three_phase};
          const Study study(std::move(without), options);
          study.for_each_fault([&](const FaultResult& r) {
            BOOST_TEST(near(check.through_ka, r.current_ka, kAgreement * std::max(1.0, expected)));
          });
          ++opened;
        }
      }
    }
  }
  BOOST_TEST(compared > 500U);
  BOOST_TEST(own > 50U);
  BOOST_TEST(opened > 20U);
}

namespace {

// The same in C37's interrupting network, for one kind of fault at one end of the switch.
double through_a_switch_later(Network n, std::size_t place, const DutyCheck& check) {
  (void)fill_defaults(n);
  std::vector<Finding> missing;
  ieee_c37::apply(ieee_c37::machine_reactances(n, ieee_c37::DutyNetwork::interrupting,
                                               ieee_c37::SmallMotors::combined, missing),
                  n);
  Bus bus = n.bus(*places(n)[place].bus);
  bus.id = "behind the switch";
  const BusIndex here = *places(n)[place].bus, there{static_cast<std::uint32_t>(n.buses.size())};
  n.buses.push_back(bus);
  *places(n)[place].bus = there;
  BusSwitch s;
  s.id = "switch of the test";
  s.from = here;
  s.to = there;
  n.switches.push_back(s);
  const ElementRef ref{ElementKind::bus_switch, static_cast<std::uint32_t>(n.switches.size() - 1)};
  StudyOptions options;
  options.buses = {check.side == DutySide::own ? here : there};
  options.kinds = {check.kind};
  const Study study(std::move(n), options);
  double ka = 0;
  study.for_each_fault([&](const StudiedFault& fault) {
    for (const Contribution& c : fault.result.contributions)
      if (c.element == ref) ka = largest_phase(c.sequence_ka);
  });
  return ka;
}

}  // namespace

BOOST_AUTO_TEST_CASE(interrupting_current_through_a_device_is_that_of_the_interrupting_network) {
  std::size_t compared = 0, own = 0;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    Network n = network_of(seed);
    for (std::size_t p = seed % 3; p < places(n).size(); p += 3) {
      const Place place = places(n)[p];
      if (!is_in_the_network(n, place)) continue;
      Network judged = n;
      judged.breakers = {plain_device(DeviceFamily::ansi, *place.bus, place.branch)};
      judged.breakers[0].standard = DeviceStandard::c37_constant_ka;
      judged.breakers[0].interrupting_ka = 1000;
      judged.breakers[0].interrupting_time_cycles = 5;
      judged.fuses.clear();
      judged.switchboards.clear();
      const DutyTable table = duty(judged, {});
      const DutyCheck& check = table.devices.at(0).checks.at(0);
      if (!check.has_duty()) continue;
      const double expected = through_a_switch_later(n, p, check);
      BOOST_TEST_CONTEXT("seed " << seed << ", " << element(n, place.branch).id) {
        BOOST_TEST(near(check.through_ka, expected, kAgreement * std::max(1.0, expected)));
      }
      ++compared;
      if (check.side == DutySide::own && expected > 0) ++own;
    }
  }
  BOOST_TEST(compared > 200U);
  BOOST_TEST(own > 30U);
}

BOOST_AUTO_TEST_CASE(outages_are_the_scenarios_that_take_the_element_out_and_threads_change_nothing) {
  for (std::uint32_t seed = 1; seed <= 15; ++seed) {
    Network n = network_of(seed);
    n.breakers.clear();
    n.fuses.clear();
    n.switchboards.clear();
    std::size_t name = 0;
    for (const Place& place : places(n))
      for (const DeviceFamily family : {DeviceFamily::iec, DeviceFamily::ansi}) {
        n.breakers.push_back(plain_device(family, *place.bus, place.branch));
        n.breakers.back().id += std::to_string(++name);
      }
    DutyOptions options;
    options.outages = true;
    const DutyTable one = duty(n, options);
    options.study.threads = 3;
    const DutyTable three = duty(n, options);
    Network with_scenarios = n;
    for (const DutyState& state : one.states) {
      if (!state.outage) continue;
      Scenario s;
      s.id = "S" + std::to_string(with_scenarios.scenarios.size());
      if (state.outage->kind == ElementKind::bus_switch)
        s.open = {state.outage->index};
      else
        s.out = {*state.outage};
      with_scenarios.scenarios.push_back(s);
    }
    const DutyTable listed = duty(with_scenarios, {});
    BOOST_TEST_CONTEXT("seed " << seed) {
      BOOST_REQUIRE(one.states.size() == listed.states.size());
      BOOST_REQUIRE(one.devices.size() == n.breakers.size());
      for (std::size_t d = 0; d < one.devices.size(); ++d)
        for (const DutyTable* other : {&three, &listed}) {
          BOOST_TEST((one.devices[d].device == other->devices[d].device));
          for (std::size_t c = 0; c < one.devices[d].checks.size(); ++c) {
            const DutyCheck &a = one.devices[d].checks[c], &b = other->devices[d].checks[c];
            BOOST_TEST(a.duty == b.duty);
            BOOST_TEST(a.state == b.state);
            BOOST_TEST((a.kind == b.kind));
            BOOST_TEST((a.side == b.side));
            BOOST_TEST((a.verdict == b.verdict));
          }
        }
    }
  }
}

// The parts of what governs: by superposition they make the whole.
BOOST_AUTO_TEST_CASE(sources_of_a_device_make_up_its_current) {
  std::size_t whole = 0;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    Network n = network_of(seed);
    const std::size_t sources =
        n.network_feeders.size() + n.synchronous_machines.size() + n.induction_motors.size();
    for (std::size_t p = 0; p < places(n).size(); p += 4) {
      const Place place = places(n)[p];
      Network judged = n;
      judged.breakers = {plain_device(DeviceFamily::ansi, *place.bus, place.branch)};
      judged.fuses.clear();
      judged.switchboards.clear();
      const DeviceDuty d = duty(judged, {}).devices.at(0);
      if (!d.governing || d.feeds.empty()) continue;
      BOOST_TEST_CONTEXT("seed " << seed << ", " << element(n, place.branch).id) {
        double sum = 0;
        for (const DutyFeed& feed : d.feeds) sum += feed.ka;
        const double through = d.checks[*d.governing].through_ka;
        if (sources <= 5) {
          BOOST_TEST(sum > (1 - 1e-6) * through);  // parts against the whole are left out
          ++whole;
        }
        BOOST_TEST(std::is_sorted(d.feeds.begin(), d.feeds.end(),
                                  [](const auto& a, const auto& b) { return a.ka > b.ka; }));
        if (place.branch.kind == ElementKind::network_feeder &&
            d.checks[*d.governing].side == DutySide::own) {
          BOOST_TEST((d.feeds[0].source == place.branch));
          BOOST_TEST(near(d.feeds[0].ka, through, 1e-6 * through));
        }
      }
    }
  }
  BOOST_TEST(whole > 30U);
}

BOOST_AUTO_TEST_SUITE_END()
