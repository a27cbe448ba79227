// Random networks for laws that hold for every network.
#pragma once
#include <cstdint>

#include "engine/network/network.hpp"

namespace kiloamp::test {

/// A valid network made from `seed`: 4 to 24 buses on up to three voltage levels in one or two islands; every
/// kind of element; vector groups, clocks, neutrals, taps, couplings and switch states drawn at random, phase
/// shifts consistent around loops. The same seed gives the same network on every machine.
[[nodiscard]] Network random_network(std::uint32_t seed);

}  // namespace kiloamp::test
