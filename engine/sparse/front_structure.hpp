// Symbolic factorisation of the core: which vertices each front eliminates and which it updates.
#pragma once
#include <vector>

#include "engine/sparse/minimum_degree.hpp"

namespace kiloamp::sparse {

/// Fronts of the core, children before parents.
///
/// Front f eliminates pivots[pivot_begin[f]] .. and updates rows[row_begin[f]] .. (vertices eliminated later
/// that are joined to a pivot, fill included). parent[f] is the front of the first eliminated row, -1 for a
/// root.
struct FrontStructure {
  std::vector<Index> pivot_begin{0};
  std::vector<Index> pivots;
  std::vector<Index> row_begin{0};
  std::vector<Index> rows;
  std::vector<Index> parent;
  /// front_of[v] for every vertex of the core.
  std::vector<Index> front_of;
  /// rank[v]: place of v among all pivots, front by front.
  std::vector<Index> rank;
  [[nodiscard]] Index fronts() const { return static_cast<Index>(parent.size()); }
};

/// Row structure of every front by union over its children, then small fronts merged into their parents.
///
/// A merge stores explicit zeros but saves the assembly of a front; it is done while the zeros are few
/// (kFreeZeros, or kZeroShare of the merged front).
[[nodiscard]] FrontStructure front_structure(const PackedGraph& core, const FrontOrder& order);

}  // namespace kiloamp::sparse
