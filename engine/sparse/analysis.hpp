// Elimination order and symbolic factorisation of a pattern.
#pragma once
#include <memory>
#include <span>
#include <vector>

#include "engine/sparse/pattern.hpp"

namespace kiloamp::sparse {

struct EliminationPlan;

/// Elimination order and symbolic factorisation of a pattern; reused by every matrix that has the pattern.
///
/// Any undirected graph will do: no rows, islands, isolated rows, stars, chains of a million rows, cliques.
/// Rows of at most three neighbours go first, approximate minimum degree orders the rest. Nothing is
/// recursive.
///
/// @param order  rows of the matrix, >= 0
/// @param edges  places off the diagonal, 0 <= i, j < order, i != j, each unordered pair at most once:
/// asserted
/// @throws std::length_error  the factor would have more than 2^31 entries
class Analysis {
 public:
  Analysis(Index order, std::span<const Edge> edges);
  ~Analysis();
  Analysis(const Analysis&) = delete;
  Analysis& operator=(const Analysis&) = delete;

  [[nodiscard]] Index order() const;
  [[nodiscard]] std::span<const Edge> edges() const;

  /// Entries of L, diagonal included and explicit zeros of merged fronts counted.
  [[nodiscard]] std::size_t factor_entries() const;
  /// Rows on the longest way from a row to a root of the elimination tree: what a single fault costs at most.
  [[nodiscard]] Index tree_height() const;
  /// For the other files of engine/sparse.
  [[nodiscard]] const std::shared_ptr<const EliminationPlan>& plan() const { return plan_; }

 private:
  std::vector<Edge> edges_;
  std::shared_ptr<const EliminationPlan> plan_;
};

}  // namespace kiloamp::sparse
