// Which buses an element is connected to.
#pragma once
#include "engine/network/network.hpp"

namespace kiloamp {

/// In the element's own order: from before to, hv before mv before lv. Empty for what has no terminal (a
/// coupling, a scenario).
[[nodiscard]] std::vector<BusIndex> buses_of(const Network& network, ElementRef element);

}  // namespace kiloamp
