// Every single outage: the three-phase and line-to-ground current at every bus, by change of low rank.
#pragma once
#include <functional>

#include "engine/study/study.hpp"

namespace kiloamp {

struct OutageOptions {
  /// Which kinds of element go out, one at a time. Empty: lines, transformers, reactors, feeders, machines
  /// and closed switches.
  std::vector<ElementKind> kinds;
  /// Only outages up to this many branches from a bus count for that bus. Empty: all outages for all buses.
  std::optional<int> depth;
  /// Only buses of this zone. Empty: all.
  std::optional<std::string> zone;
  int threads = 1;
  /// Called now and then from one thread with how many outages are done.
  std::function<void(std::size_t done, std::size_t all)> progress;
};

/// The largest or smallest current over all outages and the outage it is found with; empty when no outage
/// moves the intact current by more than a billionth in that direction (then current_ka is the intact one).
struct OutageExtreme {
  double current_ka = 0;
  std::optional<ElementRef> outage;
};
struct OutageRow {
  BusIndex bus{};
  FaultKind kind = FaultKind::three_phase;
  double intact_ka = 0;
  OutageExtreme largest, smallest;
};
/// An outage that leaves buses without a source, or without a zero-sequence path that they had.
struct OutageSplit {
  ElementRef outage;
  std::vector<BusIndex> without_source, without_earth_path;
};
struct OutageTable {
  std::size_t outages = 0;
  std::vector<OutageRow> rows;      ///< per bus (within the zone) and kind, in the case's order
  std::vector<OutageSplit> splits;  ///< in the order of the elements
};

/// Z' = Z + W (D^-1 - U^T W)^-1 W^T with W = Z U for each outage, D and U from the element's own admittances
/// (outage_change.hpp); never a new factorisation. Where the small matrix is singular the outage may cut a
/// part off: the graph decides, the part's current is 0, and the rest follows with the part held at one
/// point. The study's fault impedances, prefault voltages, wanted buses and corrections apply. The result
/// does not depend on the number of threads. Source: Woodbury's identity.
[[nodiscard]] OutageTable single_outages(const Study& study, const OutageOptions& options);

/// Currents [kA] of one outage at every bus of the case (0 where out of service): the same computation for a
/// single element.
struct OutageCurrents {
  std::vector<double> three_phase_ka, line_to_ground_ka;
};
/// @return empty when the element is not in the model.
[[nodiscard]] std::optional<OutageCurrents> one_outage(const Study& study, ElementRef element);

}  // namespace kiloamp
