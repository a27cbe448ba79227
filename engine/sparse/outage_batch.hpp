// Many single changes of rank one, each applied alone to the same factors: an outage study.
#pragma once
#include <array>
#include <complex>
#include <functional>
#include <span>

#include "engine/sparse/low_rank_change.hpp"

namespace kiloamp::sparse {

/// A' = A + d u u^T in each lane; removing admittance y between i and j: u = e_i - e_j, d = -y.
template <typename Scalar, int Lanes>
struct RankOneChange {
  SparseVector<Scalar, Lanes> u;
  std::array<Scalar, Lanes> d;
};

/// What one change does: Z'_ij = Z_ij - gain z_i z_j for any i, j.
template <typename Scalar, int Lanes>
struct RankOneResponse {
  /// Which of the changes given.
  std::size_t change;
  /// z = Z u, all rows; valid during the visit only.
  std::span<const std::array<Scalar, Lanes>> z;
  /// 1 / (1 / d + u^T Z u), 0 where d = 0, NaN where the lane splits.
  std::array<Scalar, Lanes> gain;
  std::array<ChangeOutcome, Lanes> outcome;

  /// Z'_ij from Z_ij.
  [[nodiscard]] std::array<Scalar, Lanes> changed_entry(Index i, Index j,
                                                        const std::array<Scalar, Lanes>& before) const {
    std::array<Scalar, Lanes> after;
    for (std::size_t s = 0; s < static_cast<std::size_t>(Lanes); ++s) {
      after[s] = before[s] - gain[s] * z[static_cast<std::size_t>(i)][s] * z[static_cast<std::size_t>(j)][s];
    }
    return after;
  }
};

/// Visits every change once with its response. Columns are solved four at a time in all lanes, so one outage
/// costs a quarter of a pass over L; memory is eight columns per thread however many changes there are.
///
/// With threads > 1 the visitor runs on several threads at once, for different changes, in no fixed order: it
/// must keep what it writes apart by `response.change`. The numbers themselves do not depend on the number of
/// threads. Exceptions of the visitor end the batch and reach the caller.
template <typename Scalar, int Lanes>
void each_rank_one_change(const Factorisation<Scalar, Lanes>& factorisation,
                          std::span<const RankOneChange<Scalar, Lanes>> changes,
                          const std::function<void(const RankOneResponse<Scalar, Lanes>&)>& visit,
                          int threads = 1);

}  // namespace kiloamp::sparse
