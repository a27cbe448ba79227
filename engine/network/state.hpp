// The state of the network that is studied: a scenario's switching, and the strong or the weak case.
#pragma once
#include "engine/network/network.hpp"

namespace kiloamp {

/// Puts the network into the scenario's state. Switches and elements keep what the scenario does not name.
void apply_scenario(Network& network, std::size_t scenario);

/// Strong case: the largest current is wanted; weak case: the smallest.
enum class CaseKind : std::uint8_t { max, min };

/// Weak case: feeders at `min` where given (a scenario's own choice goes first), line resistances at the
/// conductor temperature at the end of the fault, R = R20 (1 + 0.004 (theta_e - 20)), and asynchronous motors
/// taken out of service. Strong case: nothing changes but that feeders stay at `max`. Call after
/// apply_scenario and fill_defaults. Source: IEC 60909-0:2016, 7.1.2 (minimum currents), resistance formula
/// from memory.
void apply_case_kind(Network& network, CaseKind kind);

/// True when the bus and the element itself are in service.
[[nodiscard]] inline bool is_live(const Network& network, const Element& element, BusIndex bus) {
  return element.is_in_service() && network.bus(bus).is_in_service();
}
[[nodiscard]] inline bool is_live(const Network& network, const Element& element, BusIndex one,
                                  BusIndex other) {
  return is_live(network, element, one) && network.bus(other).is_in_service();
}

/// True when the feeder's weak level is what the study takes.
[[nodiscard]] inline const FeederLevel& level_in_use(const Network& network, const NetworkFeeder& feeder) {
  return network.feeder_state == FeederState::min && feeder.min ? *feeder.min : feeder.max;
}

}  // namespace kiloamp
