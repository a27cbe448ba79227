// How well computed columns of the inverse satisfy A z = e_k.
#pragma once
#include <array>
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

/// Solves for the columns `rows`, in two sums that take turns, and measures each lane. A bad column shows in
/// the sum as it shows alone, and one pass over the factors serves however many are suspect.
template <typename Scalar, int Lanes>
[[nodiscard]] std::array<ProbeResult, Lanes> probe_columns(
    const LaneFactors<Scalar, padded_width(Lanes)>& factors, const Values<Scalar, Lanes>& values,
    std::span<const Index> rows);

/// Rows to probe: those of suspect pivots in any lane (mark above `suspect`^2) and two ordinary ones.
template <typename Scalar, int Width>
[[nodiscard]] std::vector<Index> rows_to_probe(const LaneFactors<Scalar, Width>& factors, int lanes,
                                               double suspect);

/// The row of the worst pivot of a lane.
template <typename Scalar, int Width>
[[nodiscard]] Index worst_row(const LaneFactors<Scalar, Width>& factors, int lane);

}  // namespace kiloamp::sparse
