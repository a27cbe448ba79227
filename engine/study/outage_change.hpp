// What a single outage changes in the sequence networks, as a change of low rank.
#pragma once
#include <Eigen/Core>
#include <vector>

#include "engine/fault/fault_network.hpp"

namespace kiloamp::detail {

/// Which buses of a node stay with which part when a coupler opens.
struct NodeSplit {
  Node node = Node::none;
  std::vector<BusIndex> far_buses;  ///< the part that leaves; sorted
};

/// Y' = Y - sum_r d_r u_r u_r^T per sequence, r < rank[s]; for a coupler the bordered form below.
///
/// Removal of an element: C is its own part of Y (for a line in a coupled group also what the group's matrix
/// loses by it), and C = U D U^T by symmetric elimination with the largest diagonal entry as pivot, so that a
/// series element has rank 1.
///
/// Opening a coupler: with V_far = V_n + delta for the far buses of node n, [Y c; c^T y][V; delta] = [I;
/// I_far], c the sum of the far terminals' columns, y their own sum. Hence Z'_kk = Z_kk + w_k^2 / (y - c^T
/// w), w = Z c, at every node and near bus, and Z_nn + (1 - w_n)^2 / (y - c^T w) at the far buses.
struct OutageChange {
  ElementRef element;
  std::optional<NodeSplit> split;
  std::vector<Node> nodes;  ///< where U or c has entries
  BySequence<int> rank{};
  BySequence<std::vector<std::vector<Complex>>> u;  ///< [sequence][r][place in nodes]
  BySequence<std::vector<Complex>> d;               ///< [sequence][r]; coupler: y
  /// Places in `nodes` that belong to the element's own terminals (the rest are those of lines coupled with
  /// it).
  std::vector<std::uint32_t> own;

  [[nodiscard]] int columns() const { return std::max({rank[0], rank[1], rank[2]}); }
};

/// @return empty when the element is not in the model (out of service, no fault current) or its outage
/// changes nothing (a switch of a loop).
/// @param earthed  a coupled line is earthed at both ends once it is out, as `earthed_when_out` says of
/// itself
[[nodiscard]] std::optional<OutageChange> outage_change(const Network& network, const SequenceModel& model,
                                                        const FaultNetwork& solved, ElementRef element,
                                                        std::span<const std::uint32_t> terminals,
                                                        bool earthed = false);

/// Terminals of each element, in the order of their buses.
class TerminalTable {
 public:
  explicit TerminalTable(const SequenceModel& model);
  [[nodiscard]] std::span<const std::uint32_t> of(ElementRef element) const;

 private:
  std::vector<ElementRef> elements_;
  std::vector<std::uint32_t> start_, terminals_;
};

/// Nodes (and, in a split node, its near or far part) that an outage cuts off from every source, or from
/// every path to earth.
class LostParts {
 public:
  LostParts(const SequenceModel& model, const FaultNetwork& solved);

  struct Lost {
    std::vector<Node> nodes;         ///< whole nodes
    std::vector<Node> islands;       ///< one of the element's own nodes in each part that was cut off
    bool near = false, far = false;  ///< parts of the split node
    [[nodiscard]] bool any() const { return !nodes.empty() || near || far; }
  };
  /// Searches outward from the element's terminals without it, each search ending at the first source or
  /// earth path.
  [[nodiscard]] Lost find(const OutageChange& outage, int sequence);

 private:
  using Place = std::pair<Node, bool>;  // second: the far part of the split node
  [[nodiscard]] bool supplies(std::uint32_t terminal, int sequence) const;
  bool explore(Place start, const OutageChange& outage, int sequence, std::vector<Place>& found);

  const SequenceModel* model_;
  const FaultNetwork* solved_;
  std::vector<std::uint32_t> seen_;  // 2 per node
  std::uint32_t stamp_ = 0;
};

}  // namespace kiloamp::detail
