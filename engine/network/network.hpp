// The network as the user described it, in engineering units.
#pragma once
#include <array>

#include "engine/network/branches.hpp"
#include "engine/network/devices.hpp"
#include "engine/network/sources.hpp"

namespace kiloamp {

struct Bus : Element {
  double nominal_kv = 0;
  std::optional<double> prefault_pu, prefault_deg;
  std::optional<double> voltage_tolerance_percent;  ///< of the supply, up to 1 kV: 6 or 10
  std::optional<std::array<double, 2>> position;
  std::optional<std::string> zone;
};

enum class FeederState : std::uint8_t { max, min };

/// A named state of the network; lists hold what differs from the case as written.
struct Scenario : Element {
  std::vector<std::uint32_t> open, close;  ///< indices in Network::switches
  std::vector<ElementRef> out, in;
  std::optional<FeederState> feeders;
};

/// One case. Element number i of a section is the i-th of that section in the file.
struct Network {
  std::optional<std::string> title;
  double frequency_hz = 50;
  std::optional<double> base_mva;
  std::optional<double> prefault_pu;  ///< for every bus that has none of its own

  std::vector<Bus> buses;
  std::vector<NetworkFeeder> network_feeders;
  std::vector<SynchronousMachine> synchronous_machines;
  std::vector<InductionMotor> induction_motors;
  std::vector<InverterSource> inverter_sources;
  std::vector<Line> lines;
  std::vector<MutualCoupling> mutual_couplings;
  std::vector<Transformer> transformers;
  std::vector<ThreeWindingTransformer> three_winding_transformers;
  std::vector<EarthingTransformer> earthing_transformers;
  std::vector<SeriesReactor> series_reactors;
  std::vector<Shunt> shunts;
  std::vector<BusSwitch> switches;
  std::vector<PowerStationUnit> power_station_units;
  std::vector<Breaker> breakers;
  std::vector<Fuse> fuses;
  std::vector<Switchboard> switchboards;
  std::vector<Relay> relays;
  std::vector<Scenario> scenarios;
  std::vector<UserField> user_fields;

  /// Which level the feeders have, where a scenario or the study says it; otherwise max.
  std::optional<FeederState> feeder_state;

  [[nodiscard]] const Bus& bus(BusIndex index) const { return buses[at(index)]; }
  [[nodiscard]] double base() const { return base_mva.value_or(100.0); }
};

/// Name of a section in a case ("lines") and of one element of it in prose ("line").
[[nodiscard]] const char* section_name(ElementKind kind);
[[nodiscard]] const char* kind_name(ElementKind kind);

/// The common part of the element that `ref` names; ref must be of this network.
[[nodiscard]] const Element& element(const Network& network, ElementRef ref);
[[nodiscard]] Element& element(Network& network, ElementRef ref);

/// Calls visit(kind, vector) for each section, in ElementKind order.
template <typename AnyNetwork, typename Visit>
void for_each_section(AnyNetwork& n, Visit&& visit) {
  visit(ElementKind::bus, n.buses);
  visit(ElementKind::network_feeder, n.network_feeders);
  visit(ElementKind::synchronous_machine, n.synchronous_machines);
  visit(ElementKind::induction_motor, n.induction_motors);
  visit(ElementKind::inverter_source, n.inverter_sources);
  visit(ElementKind::line, n.lines);
  visit(ElementKind::mutual_coupling, n.mutual_couplings);
  visit(ElementKind::transformer, n.transformers);
  visit(ElementKind::three_winding_transformer, n.three_winding_transformers);
  visit(ElementKind::earthing_transformer, n.earthing_transformers);
  visit(ElementKind::series_reactor, n.series_reactors);
  visit(ElementKind::shunt, n.shunts);
  visit(ElementKind::bus_switch, n.switches);
  visit(ElementKind::power_station_unit, n.power_station_units);
  visit(ElementKind::breaker, n.breakers);
  visit(ElementKind::fuse, n.fuses);
  visit(ElementKind::switchboard, n.switchboards);
  visit(ElementKind::relay, n.relays);
  visit(ElementKind::scenario, n.scenarios);
}

}  // namespace kiloamp
