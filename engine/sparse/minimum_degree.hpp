// Approximate minimum degree order of the core graph, as a list of fronts.
#pragma once
#include <vector>

#include "engine/sparse/graph_reduction.hpp"

namespace kiloamp::sparse {

/// Vertices that are eliminated together, in the order of the fronts.
struct FrontOrder {
  /// front_of[v]: the front in which vertex v is eliminated; fronts are numbered in elimination order.
  std::vector<Index> front_of;
  Index fronts = 0;
};

/// Orders a graph by approximate minimum external degree on its quotient graph.
///
/// Vertices that become indistinguishable are merged, vertices whose neighbours all lie in the new clique are
/// eliminated with it, and cliques inside the new clique are absorbed. Vertices of degree above
/// kDenseFactor * sqrt(order) are eliminated last. Time about O(edges * average clique), memory linear.
///
/// Source: Amestoy, Davis, Duff, "An approximate minimum degree ordering algorithm", SIAM J. Matrix Anal.
///         Appl. 17 (1996) 886-905; from memory. Differs: cliques go to a growing pool, so no garbage
///         collection.
[[nodiscard]] FrontOrder minimum_degree_order(const PackedGraph& graph);

}  // namespace kiloamp::sparse
