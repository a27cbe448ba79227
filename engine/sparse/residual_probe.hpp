// How well computed columns of the inverse satisfy A z = e_k.
#pragma once
#include <algorithm>
#include <array>
#include <cstddef>
#include <span>

#include "engine/sparse/column_solver.hpp"
#include "engine/sparse/elimination.hpp"

namespace kiloamp::sparse {

/// What a probe found in one lane; not-a-number counts as infinite. z is the sum of the columns k of one of
/// the two solutions, b the sum of their e_k.
struct ProbeResult {
  double residual = 0;       // |A z - b|_inf
  double rounding = 0;       // largest (|A| |z|)_i, parts taken apart: times epsilon, what rounding excuses
  double magnification = 0;  // largest |a_kk z_k|

  void include(const ProbeResult& other);
};

/// Below this the share of rounding in a mismatch is not worth measuring.
inline constexpr double kCleanResidual = 1e-10;
/// True where no lane has a larger mismatch.
template <std::size_t Lanes>
[[nodiscard]] bool is_clean(const std::array<ProbeResult, Lanes>& results) {
  return std::ranges::all_of(results, [](const auto& one) { return one.residual <= kCleanResidual; });
}

/// Right-hand sides of a probe.
inline constexpr int kProbeBlock = 2;
template <typename Scalar, int Lanes>
using ProbeSolver = ColumnSolver<Scalar, Lanes, kProbeBlock>;

/// Solves for the columns `rows`, in two sums that take turns, and measures each lane. A bad column shows in
/// the sum as it shows alone, and one pass over the factors serves however many are suspect.
template <typename Scalar, int Lanes>
[[nodiscard]] std::array<ProbeResult, Lanes> probe_columns(ProbeSolver<Scalar, Lanes>& solver,
                                                           const EliminationPlan& plan,
                                                           const Values<Scalar, Lanes>& values,
                                                           std::span<const Index> rows);

/// The same for the columns and equations of the plan's spot: what such a column costs does not grow with the
/// matrix. Enough where no pivot row grew: the equations elsewhere have nothing that could be wrong.
template <typename Scalar, int Lanes>
[[nodiscard]] std::array<ProbeResult, Lanes> probe_spot(ProbeSolver<Scalar, Lanes>& solver,
                                                        const EliminationPlan& plan,
                                                        const Values<Scalar, Lanes>& values);

/// True where no pivot in any lane is suspect and no pivot row outgrew its own diagonal entry: nowhere has
/// elimination magnified rounding by more than kSuspectGrowth.
template <typename Scalar, int Width>
[[nodiscard]] bool is_sound(const LaneFactors<Scalar, Width>& factors, int lanes);

/// Rows to probe: those of suspect pivots in any lane and those of the plan's spot.
template <typename Scalar, int Width>
[[nodiscard]] std::vector<Index> rows_to_probe(const LaneFactors<Scalar, Width>& factors, int lanes);

/// The row of the worst pivot of a lane.
template <typename Scalar, int Width>
[[nodiscard]] Index worst_row(const LaneFactors<Scalar, Width>& factors, int lane);

}  // namespace kiloamp::sparse
