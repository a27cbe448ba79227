// What stands in for a lane whose unpivoted factors are not good enough.
#pragma once
#include <complex>
#include <functional>
#include <memory>
#include <span>
#include <vector>

#include "engine/sparse/pattern.hpp"

namespace kiloamp::sparse {

/// A copy of one lane's matrix, with its own way of solving: refinement of the plain solution, or a pivoting
/// LU.
template <typename Scalar>
class LaneRemedy {
 public:
  /// Solves with the lane's plain factors, in place.
  using PlainSolve = std::function<void(std::span<Scalar>)>;

  LaneRemedy(std::span<const Edge> edges, std::vector<Scalar> diagonal, std::vector<Scalar> off_diagonal);
  ~LaneRemedy();
  LaneRemedy(const LaneRemedy&) = delete;
  LaneRemedy& operator=(const LaneRemedy&) = delete;

  /// Factorises by Eigen::SparseLU (column pivoting by degree, row pivoting by size). False: a column without
  /// a pivot.
  [[nodiscard]] bool pivot();
  [[nodiscard]] bool pivoting() const { return lu_ != nullptr; }

  /// x = A^-1 b in place: by LU after pivot(), else x0 + A^-1 (b - A x0) with `plain` for both solutions.
  void solve(std::span<Scalar> b, const PlainSolve& plain) const;

  /// |A x - b|_inf, infinite if it is not a number.
  [[nodiscard]] double residual(std::span<const Scalar> x, std::span<const Scalar> b) const;

  /// Inverse at the places of the pattern, one full column after the other.
  void invert(const PlainSolve& plain, const std::function<void(Index row, Scalar z)>& diagonal,
              const std::function<void(Index edge, Scalar z)>& off_diagonal) const;

 private:
  struct Lu;
  void subtract_product(std::span<const Scalar> x, std::span<Scalar> from) const;

  std::span<const Edge> edges_;
  std::vector<Scalar> diagonal_;
  std::vector<Scalar> off_diagonal_;
  std::unique_ptr<Lu> lu_;
};

}  // namespace kiloamp::sparse
