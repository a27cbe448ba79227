// The network states of a duty study.
#pragma once
#include "engine/study/duty.hpp"

namespace kiloamp::detail {

/// The case as written and its scenarios in service, or the one scenario asked for; with outages, each
/// element that may go out alone from the first of them.
[[nodiscard]] std::vector<DutyState> duty_states(const Network& network, const DutyOptions& options);

/// The network of a state with an outage: scenario applied, element out. Without an outage as given: the
/// study applies the scenario.
[[nodiscard]] Network in_state(const Network& given, const DutyState& state);

}  // namespace kiloamp::detail
