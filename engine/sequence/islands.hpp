// Which nodes hang together in a sequence network, and whether current finds a way there; part of building
// the model.
#pragma once
#include "engine/sequence/sequence_model.hpp"

namespace kiloamp::detail {

/// Disjoint sets of nodes. In the zero-sequence network each node also carries the ratio of its no-current
/// voltage to its root's, so that a loop of transformers whose ratios do not multiply to 1 is seen: current
/// circulates in it, and it counts as a path to earth.
class Islands {
 public:
  explicit Islands(std::size_t nodes);

  /// Joins a and b; v_b / v_a = ratio when no current flows. A contradiction with what is joined already
  /// marks the island.
  void join(Node a, Node b, double ratio = 1.0);
  /// The island of `n` has what is looked for: a source, a path to earth.
  void mark(Node n);

  [[nodiscard]] bool is_marked(Node n) const;
  /// v_n / v_representative when no current flows.
  [[nodiscard]] double ratio(Node n) const { return find(at(n)).ratio; }
  /// The node that stands for the island of `n`.
  [[nodiscard]] Node representative(Node n) const { return static_cast<Node>(find(at(n)).root); }
  /// One node of each island without a mark.
  [[nodiscard]] std::vector<Node> unmarked_representatives() const;

 private:
  struct Found {
    std::size_t root;
    double ratio;  // v_n / v_root
  };
  [[nodiscard]] Found find(std::size_t n) const;

  mutable std::vector<std::size_t> parent_;
  mutable std::vector<double> ratio_;
  std::vector<std::uint32_t> size_;
  std::vector<bool> marked_;
};

/// A positive-sequence connection: `to` lags `from` by `lag` times 30 degrees.
struct Link {
  Node from, to;
  std::uint8_t lag;
  ElementRef element;
};

/// lag_clock per node; 0 at the first node of each island.
/// @throws NetworkError  naming the elements of each loop whose lags do not add up to a multiple of 12.
[[nodiscard]] std::vector<std::uint8_t> lag_clocks(const Network& network, std::size_t nodes,
                                                   const std::vector<Link>& links);

}  // namespace kiloamp::detail
