// What a change of a few branches does to the inverse, without a new factorisation.
#pragma once
#include <array>
#include <complex>
#include <span>
#include <vector>

#include "engine/sparse/factorisation.hpp"

namespace kiloamp::sparse {

/// The change cannot be told from one that makes the matrix singular once |I + D U^T Z U| falls below this
/// many roundings of its terms; the result would have lost all but about four digits.
inline constexpr double kSplitMargin = 1e4;

/// Outcome of a change in one lane. A value, not an error: taking out the only tie of an island is a true
/// result.
enum class ChangeOutcome {
  kSolved,
  /// A' is singular to working precision: the change cuts rows off, or a nearly ideal branch hides the
  /// difference. The caller removes the rows cut off and factorises again.
  kSplits,
};

/// One vector u of a change, sparse, its values per lane (0 in a lane that the branch is not part of).
template <typename Scalar, int Lanes>
using SparseVector = std::vector<Term<Scalar, Lanes>>;

/// A' = A + U D U^T for k vectors (columns of U) and a k x k matrix D, all different in each lane if need be.
///
///   Z' = Z - W G W^T,   W = Z U (k columns of solutions),   G = (I + D U^T Z U)^-1 D.
///
/// Removing a branch of admittance y between rows i and j: u = e_i - e_j, d = -y. A branch that ends at one
/// row only in some lane has a zero term for the other row there. A lane without any change has d = 0. D need
/// not be regular. Memory: k columns. The factorisation is needed during construction only.
///
/// Source: Sherman, Morrison, Ann. Math. Stat. 21 (1950) 124-127; Woodbury 1950; from memory.
template <typename Scalar, int Lanes>
class LowRankChange {
 public:
  using Entry = std::array<Scalar, Lanes>;

  /// @param d  k x k entries, row by row; symmetric
  LowRankChange(const Factorisation<Scalar, Lanes>& factorisation,
                std::span<const SparseVector<Scalar, Lanes>> u, std::span<const Entry> d);

  [[nodiscard]] int rank() const { return rank_; }
  [[nodiscard]] const std::array<ChangeOutcome, Lanes>& outcome() const { return outcome_; }

  /// Z'_ij from Z_ij (Factorisation::inverse_entry or the selected inverse). In a lane that splits: NaN.
  [[nodiscard]] Entry changed_entry(Index i, Index j, const Entry& before) const;
  /// Z'_ii of all rows from Z_ii, in place.
  void change_diagonal(std::span<Entry> diagonal) const;
  /// Z' at the places of the pattern from Z there, in place.
  void change(std::span<const Edge> edges, InverseOnPattern<Scalar, Lanes>& inverse) const;
  /// Column W_b = Z u_b of the unchanged inverse.
  [[nodiscard]] std::span<const Entry> response(int b) const;

 private:
  void find_gain(int lane, std::span<const SparseVector<Scalar, Lanes>> u, std::span<const Entry> d);

  std::size_t order_;
  int rank_;
  std::vector<Entry> w_;     // w_[b * order_ + row]
  std::vector<Entry> gain_;  // k x k, G
  std::array<ChangeOutcome, Lanes> outcome_{};
};

extern template class LowRankChange<std::complex<double>, 1>;
extern template class LowRankChange<std::complex<double>, 3>;
extern template class LowRankChange<std::complex<double>, 4>;
extern template class LowRankChange<double, 1>;
extern template class LowRankChange<double, 2>;
extern template class LowRankChange<double, 4>;

}  // namespace kiloamp::sparse
