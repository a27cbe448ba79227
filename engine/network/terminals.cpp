#include "engine/network/terminals.hpp"

namespace kiloamp {

std::vector<BusIndex> buses_of(const Network& n, ElementRef ref) {
  const auto i = ref.index;
  switch (ref.kind) {
    case ElementKind::bus:
      return {static_cast<BusIndex>(i)};
    case ElementKind::network_feeder:
      return {n.network_feeders[i].bus};
    case ElementKind::synchronous_machine:
      return {n.synchronous_machines[i].bus};
    case ElementKind::induction_motor:
      return {n.induction_motors[i].bus};
    case ElementKind::inverter_source:
      return {n.inverter_sources[i].bus};
    case ElementKind::line:
      return {n.lines[i].from, n.lines[i].to};
    case ElementKind::transformer:
      return {n.transformers[i].hv_bus, n.transformers[i].lv_bus};
    case ElementKind::three_winding_transformer: {
      const auto& t = n.three_winding_transformers[i];
      std::vector<BusIndex> buses{t.hv_bus, t.mv_bus};
      if (t.lv_bus) buses.push_back(*t.lv_bus);
      return buses;
    }
    case ElementKind::earthing_transformer:
      return {n.earthing_transformers[i].bus};
    case ElementKind::series_reactor:
      return {n.series_reactors[i].from, n.series_reactors[i].to};
    case ElementKind::shunt:
      return {n.shunts[i].bus};
    case ElementKind::bus_switch:
      return {n.switches[i].from, n.switches[i].to};
    case ElementKind::breaker:
      return {n.breakers[i].bus};
    case ElementKind::fuse:
      return {n.fuses[i].bus};
    case ElementKind::switchboard:
      return {n.switchboards[i].bus};
    case ElementKind::relay:
      return {n.relays[i].bus};
    case ElementKind::mutual_coupling:
    case ElementKind::power_station_unit:
    case ElementKind::scenario:
      return {};
  }
  return {};
}

}  // namespace kiloamp
