#include "engine/network/network.hpp"

#include <cassert>

namespace kiloamp {

namespace {

struct KindNames {
  const char* section;
  const char* kind;
};
constexpr KindNames kNames[] = {
    {"buses", "bus"},
    {"network_feeders", "network feeder"},
    {"synchronous_machines", "synchronous machine"},
    {"induction_motors", "induction motor"},
    {"inverter_sources", "inverter source"},
    {"lines", "line"},
    {"mutual_couplings", "mutual coupling"},
    {"transformers", "transformer"},
    {"three_winding_transformers", "three-winding transformer"},
    {"earthing_transformers", "earthing transformer"},
    {"series_reactors", "series reactor"},
    {"shunts", "shunt"},
    {"switches", "switch"},
    {"power_station_units", "power station unit"},
    {"breakers", "breaker"},
    {"fuses", "fuse"},
    {"switchboards", "switchboard"},
    {"relays", "relay"},
    {"scenarios", "scenario"},
};

template <typename AnyNetwork>
auto& find_element(AnyNetwork& network, ElementRef ref) {
  using Common = std::conditional_t<std::is_const_v<AnyNetwork>, const Element, Element>;
  Common* found = nullptr;
  for_each_section(network, [&](ElementKind kind, auto& section) {
    if (kind == ref.kind && ref.index < section.size()) found = &section[ref.index];
  });
  assert(found != nullptr);
  return *found;
}

}  // namespace

const char* section_name(ElementKind kind) { return kNames[static_cast<std::size_t>(kind)].section; }
const char* kind_name(ElementKind kind) { return kNames[static_cast<std::size_t>(kind)].kind; }

const Element& element(const Network& network, ElementRef ref) { return find_element(network, ref); }
Element& element(Network& network, ElementRef ref) { return find_element(network, ref); }

}  // namespace kiloamp
