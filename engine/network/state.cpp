#include "engine/network/state.hpp"

namespace kiloamp {

void apply_scenario(Network& network, std::size_t scenario) {
  const Scenario& wanted = network.scenarios[scenario];
  for (const auto index : wanted.open) network.switches[index].closed = false;
  for (const auto index : wanted.close) network.switches[index].closed = true;
  for (const ElementRef ref : wanted.out) element(network, ref).in_service = false;
  for (const ElementRef ref : wanted.in) element(network, ref).in_service = true;
  if (wanted.feeders) network.feeder_state = *wanted.feeders;
}

void apply_case_kind(Network& network, CaseKind kind) {
  if (kind == CaseKind::max) return;
  if (!network.feeder_state) network.feeder_state = FeederState::min;
  for (Line& line : network.lines) {
    const double hot = 1.0 + 0.004 * (line.end_temperature_c.value_or(20.0) - 20.0);
    line.r1_ohm_per_km *= hot;
    if (line.r0_ohm_per_km) *line.r0_ohm_per_km *= hot;
  }
  for (InductionMotor& motor : network.induction_motors) motor.in_service = false;
  for (InverterSource& source : network.inverter_sources) source.in_service = false;
}

}  // namespace kiloamp
