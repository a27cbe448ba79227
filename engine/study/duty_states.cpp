#include "engine/study/duty_states.hpp"

namespace kiloamp::detail {

std::vector<DutyState> duty_states(const Network& network, const DutyOptions& options) {
  std::vector<DutyState> states;
  const std::optional<std::size_t> first = options.scenario;
  states.push_back({first, std::nullopt});
  for (std::size_t s = 0; s < network.scenarios.size() && !first; ++s)
    if (network.scenarios[s].is_in_service()) states.push_back({s, std::nullopt});
  if (!options.outages) return states;
  Network base = network;
  if (first) apply_scenario(base, *first);
  for_each_section(base, [&](ElementKind kind, const auto& section) {
    if (kind != ElementKind::network_feeder && kind != ElementKind::synchronous_machine &&
        kind != ElementKind::line && kind != ElementKind::transformer &&
        kind != ElementKind::three_winding_transformer && kind != ElementKind::earthing_transformer &&
        kind != ElementKind::series_reactor && kind != ElementKind::bus_switch)
      return;
    for (std::uint32_t i = 0; i < section.size(); ++i)
      if (section[i].is_in_service() && (kind != ElementKind::bus_switch || base.switches[i].closed))
        states.push_back({first, ElementRef{kind, i}});
  });
  return states;
}

Network in_state(const Network& given, const DutyState& state) {
  Network network = given;
  if (!state.outage) return network;
  if (state.scenario) apply_scenario(network, *state.scenario);
  if (state.outage->kind == ElementKind::bus_switch)
    network.switches[state.outage->index].closed = false;
  else
    element(network, *state.outage).in_service = false;
  return network;
}

}  // namespace kiloamp::detail
