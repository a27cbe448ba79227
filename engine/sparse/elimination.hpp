// Numeric factorisation A = L D L^T without pivoting, all lanes together.
#pragma once
#include <array>
#include <complex>
#include <vector>

#include "engine/sparse/lane_factors.hpp"

namespace kiloamp::sparse {

/// `Lanes` symmetric matrices: entry (i, i) of lane s is diagonal[i][s]; entry at edges[e] is
/// off_diagonal[e][s].
template <typename Scalar, int Lanes>
struct Values {
  std::vector<std::array<Scalar, Lanes>> diagonal;
  std::vector<std::array<Scalar, Lanes>> off_diagonal;
};

/// Memory of one elimination at a time, worth keeping.
template <typename Scalar>
struct EliminationWorkspace {
  struct Worker {
    std::vector<Pack<Scalar, 4>> front;
    std::vector<Pack<Scalar, 4>> stack;
  };
  std::vector<Pack<Scalar, 4>> kept;
  std::vector<Worker> workers;
};

/// Fills factors.slots with L and 1 / D of `values`, and factors.watches.
///
/// Symmetric, not Hermitian: no entry is conjugated. Zero pivots are not avoided: they give infinite marks in
/// the watches and NaN factors, which the caller has to look for. Bit for bit the same for any number of
/// threads.
///
/// Source: multifrontal elimination: Duff, Reid, ACM Trans. Math. Softw. 9 (1983) 302-325; from memory.
/// Differs:
///         rows of at most three neighbours bypass the fronts, pivots stand last in a front.
template <typename Scalar, int Lanes>
void eliminate(LaneFactors<Scalar, padded_width(Lanes)>& factors, EliminationWorkspace<Scalar>& workspace,
               const Values<Scalar, Lanes>& values, int threads);

/// The position with the worst mark among the columns of `step` in `lane`.
template <typename Scalar, int Width>
[[nodiscard]] Index worst_pivot(const LaneFactors<Scalar, Width>& factors, Index step, int lane);

}  // namespace kiloamp::sparse
