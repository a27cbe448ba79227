// What a relay measures, against the network really put into that state.
#include <algorithm>
#include <map>

#include "engine/study/relays.hpp"
#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(relay_laws)

namespace {

constexpr double kAgreement =
    1e-8;  // relative, of the largest value of the fault: removal of a strong branch costs digits
constexpr std::uint32_t kNetworks = 60;

// The network in a row's state, and for a fault at an open end a bus of its own there.
struct Really {
  Network network;
  BusIndex fault_bus;
};
Really really(const Network& given, const RelayLocation& location, const RelayRow& row) {
  Network n = given;
  n.scenarios.clear();
  if (row.state.element) {
    const ElementRef out = *row.state.element;
    if (out.kind == ElementKind::bus_switch)
      n.switches[out.index].closed = false;
    else
      element(n, out).in_service = false;
    if (row.state.kind == RelayStateKind::parallel_line_earthed) n.lines[out.index].earthed_when_out = true;
  }
  if (row.place != RelayFaultPlace::line_end) return {std::move(n), row.place_bus};
  Bus end = n.bus(row.place_bus);
  end.id = "open end";
  end.prefault_pu = n.bus(location.bus).prefault_pu;
  n.buses.push_back(end);
  Line& line = n.lines[location.branch.index];
  (line.from == location.bus ? line.to : line.from) = static_cast<BusIndex>(n.buses.size() - 1);
  const auto fault_bus = static_cast<BusIndex>(n.buses.size() - 1);
  return {std::move(n), fault_bus};
}

double size_of(const BySequence<Complex>& v) {
  return std::max({std::abs(v[0]), std::abs(v[1]), std::abs(v[2])});
}

}  // namespace

BOOST_AUTO_TEST_CASE(every_row_is_what_the_network_in_that_state_gives) {
  std::map<RelayStateKind, std::size_t> states;
  std::map<RelayFaultPlace, std::size_t> places;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    Network n = random_network(seed);
    n.scenarios.clear();
    RelayOptions options;
    options.everywhere = true;
    options.study.include_shunts = seed % 3 == 0;
    const RelayStudy study(n, options);
    const auto workspace = study.make_workspace();
    std::vector<RelayRow> rows;
    const auto& locations = study.locations().list;
    for (std::size_t l = seed % 4; l < locations.size(); l += 4) {
      const RelayLocation& location = locations[l];
      study.at_location(l, *workspace, rows);
      for (std::size_t r = l % 3; r < rows.size(); r += 3) {
        const RelayRow& row = rows[r];
        StudyOptions plain = options.study;
        if (row.state.kind == RelayStateKind::min_sources) plain.case_kind = CaseKind::min;
        Really real = really(n, location, row);
        BOOST_TEST_CONTEXT("seed " << seed << ", " << n.bus(location.bus).id << " into "
                                   << element(n, location.branch).id << ", " << state_name(n, row.state)
                                   << ", " << place_name(row.place) << " " << n.bus(row.place_bus).id
                                   << ", kind " << static_cast<int>(row.kind)) {
          const Study whole(std::move(real.network), plain);
          auto scratch = whole.solver().make_workspace();
          FaultResult result;
          whole.solver().solve({real.fault_bus, row.kind, 0, 0}, {10}, *scratch, result);
          const double ka = std::max(1.0, size_of(result.sequence_ka));
          for (int s = 0; s < 3; ++s)
            BOOST_TEST(near(row.fault_ka[s], result.sequence_ka[s], kAgreement * ka));
          std::optional<BySequence<Complex>> into_bus;
          for (const auto* list : {&result.contributions, &result.branch_currents})
            for (const Contribution& c : *list)
              if (c.element == location.branch && c.bus == location.bus) into_bus = c.sequence_ka;
          if (!into_bus) {  // the state parts the fault from the relay
            BOOST_TEST(size_of(row.primary.current_ka) <= kAgreement * ka);
            BOOST_TEST(!row.infeed_factor.has_value());
            continue;
          }
          for (int s = 0; s < 3; ++s) {
            const Complex expected = row.place == RelayFaultPlace::close_in
                                         ? result.sequence_ka[s] - (*into_bus)[s]
                                         : -(*into_bus)[s];
            BOOST_TEST(near(row.primary.current_ka[s], expected, kAgreement * ka * 10),
                       "current, sequence " << s);
          }
          const auto voltage = std::find_if(result.voltages.begin(), result.voltages.end(),
                                            [&](const BusVoltage& v) { return v.bus == location.bus; });
          BOOST_REQUIRE((voltage != result.voltages.end()));
          const double kv = n.bus(location.bus).nominal_kv;
          for (int s = 0; s < 3; ++s)
            BOOST_TEST(near(row.primary.voltage_kv[s], voltage->sequence_kv[s], kAgreement * kv),
                       "voltage, sequence " << s);
        }
        ++states[row.state.kind];
        ++places[row.place];
      }
    }
  }
  for (const RelayStateKind kind :
       {RelayStateKind::intact, RelayStateKind::out, RelayStateKind::strongest_source_out,
        RelayStateKind::parallel_line_earthed, RelayStateKind::min_sources})
    BOOST_TEST(states[kind] > 20U, static_cast<int>(kind));
  for (const RelayFaultPlace place : {RelayFaultPlace::close_in, RelayFaultPlace::remote_bus,
                                      RelayFaultPlace::line_end, RelayFaultPlace::further_bus})
    BOOST_TEST(places[place] > 50U, place_name(place));
}

// A line that ends open and has no charging and no coupling: nothing feeds the fault but the relay.
BOOST_AUTO_TEST_CASE(a_loop_that_should_measures_the_impedance_of_a_radial_line) {
  std::size_t compared = 0;
  for (std::uint32_t seed = 1; seed <= kNetworks; ++seed) {
    Network n = random_network(seed);
    n.scenarios.clear();
    n.mutual_couplings.clear();
    for (Line& line : n.lines) line.b0_us_per_km.reset();
    RelayOptions options;
    options.everywhere = true;
    const RelayStudy study(n, options);
    const auto workspace = study.make_workspace();
    std::vector<RelayRow> rows;
    for (std::size_t l = 0; l < study.locations().list.size(); ++l) {
      const RelayLocation& location = study.locations().list[l];
      if (location.branch.kind != ElementKind::line) continue;
      const Complex z = line_impedance_ohm(study.intact().network().lines[location.branch.index])[kPositive];
      study.at_location(l, *workspace, rows);
      for (const RelayRow& row : rows) {
        if (row.place != RelayFaultPlace::line_end || row.state.kind == RelayStateKind::min_sources) continue;
        const auto& loops = row.loops;
        std::vector<std::optional<Complex>> right;
        if (row.kind == FaultKind::three_phase)
          right = {loops.ab, loops.bc, loops.ca};
        else if (row.kind == FaultKind::line_to_line)
          right = {loops.bc};
        else if (std::abs(row.primary.current_ka[kZero]) < 1e-3)
          continue;  // no earth current to speak of: the earth loops have nothing to measure
        else if (row.kind == FaultKind::line_to_ground)
          right = {loops.a};
        else
          right = {loops.bc, loops.b, loops.c};
        BOOST_TEST_CONTEXT("seed " << seed << ", " << element(n, location.branch).id << ", kind "
                                   << static_cast<int>(row.kind)) {
          for (const auto& loop : right) {
            BOOST_REQUIRE(loop.has_value());
            BOOST_TEST(near(*loop, z, 1e-6 * std::abs(z)));
          }
          BOOST_TEST(std::abs(*row.infeed_factor - 1) < 1e-6);
          BOOST_TEST((row.direction == Direction::forward));
        }
        ++compared;
      }
    }
  }
  BOOST_TEST(compared > 500U);
}

BOOST_AUTO_TEST_SUITE_END()
