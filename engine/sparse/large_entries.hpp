// The entries of a column of the inverse that are not small, without computing the others.
#pragma once
#include <functional>
#include <span>
#include <vector>

#include "engine/sparse/lane_factors.hpp"

namespace kiloamp::sparse {

/// Finds every row k of a column z = A^-1 e_j with |z_k| > threshold floor_k, in one lane of plain factors.
///
/// Backward substitution gives x_p = -sum_s L_sp x_s over the rows s above p in the elimination tree, away
/// from the path of j. With a_p = sum_s |L_sp| every x at and below p obeys |x| <= G_p max_s |x_s|, where G_p
/// = max(a_p, max(1, a_p) max over children G_c). A subtree is left out when G_p max_s |x_s| is at most
/// threshold times the smallest floor in it: the bound is computed from the factors themselves and holds for
/// any matrix.
///
/// One per thread, valid while the factors live.
template <typename Scalar, int Lanes>
class LargeEntries {
 public:
  /// @param floor  one number >= 0 per row
  LargeEntries(const LaneFactors<Scalar, padded_width(Lanes)>& factors, int lane,
               std::span<const double> floor);

  /// Calls visit(k, z_k) for every such row, in no fixed order.
  void column(Index j, double threshold, const std::function<void(Index k, Scalar z)>& visit);

 private:
  [[nodiscard]] Scalar substituted(Index position) const;
  void keep(Index position, Scalar x);
  [[nodiscard]] double largest_above(Index position) const;

  const EliminationPlan* plan_;
  std::vector<Scalar> entry_;  // of L and 1 / D, by slot
  // By position:
  std::vector<double> floor_;
  std::vector<double> growth_;       // G
  std::vector<double> least_floor_;  // smallest in the subtree
  std::vector<Index> child_begin_, children_;
  std::vector<Scalar> x_;     // of the rows computed for the column at hand
  std::vector<double> size_;  // |x|
  std::vector<bool> on_path_;
  std::vector<Index> path_, stack_;
};

extern template class LargeEntries<std::complex<double>, 3>;

}  // namespace kiloamp::sparse
