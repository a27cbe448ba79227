#include <algorithm>

#include "engine/network/judge.hpp"
#include "engine/network/terminals.hpp"

namespace kiloamp::detail {

namespace {

void judge_place(Findings& out, ElementRef ref, BusIndex bus, const std::optional<ElementRef>& branch) {
  if (!branch) return;
  const auto buses = buses_of(out.network(), *branch);
  if (std::find(buses.begin(), buses.end(), bus) == buses.end())
    out.error(ref, "branch",
              '"' + element(out.network(), *branch).id + "\" does not end at bus \"" +
                  out.network().bus(bus).id + '"',
              "the branch must be connected to the bus", "correct bus or branch");
}

template <typename Device>
void judge_ratings(Findings& out, ElementRef ref, const Device& d) {
  const double nominal = out.network().bus(d.bus).nominal_kv;
  if (d.rated_kv && nominal > 0 && *d.rated_kv < nominal)
    out.error(ref, "rated_kv",
              number_text(*d.rated_kv) + " at bus \"" + out.network().bus(d.bus).id + "\" of " +
                  number_text(nominal) + " kV",
              "must not be below the voltage of its bus",
              "check the plate: rated voltage is the highest the device may see");
}

}  // namespace

void judge_devices(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.breakers.size(); ++i) {
    if (!out.judges({ElementKind::breaker, i})) continue;
    judge_place(out, {ElementKind::breaker, i}, n.breakers[i].bus, n.breakers[i].branch);
    judge_ratings(out, {ElementKind::breaker, i}, n.breakers[i]);
  }
  for (std::uint32_t i = 0; i < n.fuses.size(); ++i) {
    if (!out.judges({ElementKind::fuse, i})) continue;
    judge_place(out, {ElementKind::fuse, i}, n.fuses[i].bus, n.fuses[i].branch);
    judge_ratings(out, {ElementKind::fuse, i}, n.fuses[i]);
  }
  for (std::uint32_t i = 0; i < n.relays.size(); ++i)
    if (out.judges({ElementKind::relay, i}))
      judge_place(out, {ElementKind::relay, i}, n.relays[i].bus, n.relays[i].branch);
  for (std::uint32_t i = 0; i < n.scenarios.size(); ++i) {
    const Scenario& s = n.scenarios[i];
    const ElementRef ref{ElementKind::scenario, i};
    if (!out.judges(ref)) continue;
    for (const auto index : s.open)
      if (std::find(s.close.begin(), s.close.end(), index) != s.close.end())
        out.error(ref, "open, close", "both name \"" + n.switches[index].id + '"',
                  "a switch is open or closed in a scenario", "delete it from one list");
    for (const ElementRef element_ref : s.out)
      if (std::find(s.in.begin(), s.in.end(), element_ref) != s.in.end())
        out.error(ref, "out, in", "both name \"" + element(n, element_ref).id + '"',
                  "an element is out or in in a scenario", "delete it from one list");
  }
}

}  // namespace kiloamp::detail
