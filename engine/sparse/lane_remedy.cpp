#include "engine/sparse/lane_remedy.hpp"

#include <Eigen/SparseCore>
#include <Eigen/SparseLU>
#include <cmath>
#include <limits>

namespace kiloamp::sparse {
namespace {

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

}  // namespace

template <typename Scalar>
struct LaneRemedy<Scalar>::Lu {
  Eigen::SparseLU<Eigen::SparseMatrix<Scalar>, Eigen::COLAMDOrdering<int>> factors;
};

template <typename Scalar>
LaneRemedy<Scalar>::LaneRemedy(std::span<const Edge> edges, std::vector<Scalar> diagonal,
                               std::vector<Scalar> off_diagonal)
    : edges_(edges), diagonal_(std::move(diagonal)), off_diagonal_(std::move(off_diagonal)) {}

template <typename Scalar>
LaneRemedy<Scalar>::~LaneRemedy() = default;

template <typename Scalar>
bool LaneRemedy<Scalar>::pivot() {
  const auto order = static_cast<Index>(diagonal_.size());
  std::vector<Eigen::Triplet<Scalar>> triplets;
  for (Index row = 0; row < order; ++row) triplets.emplace_back(row, row, diagonal_[at(row)]);
  for (std::size_t e = 0; e < edges_.size(); ++e) {
    if (off_diagonal_[e] == Scalar(0)) continue;
    triplets.emplace_back(edges_[e].i, edges_[e].j, off_diagonal_[e]);
    triplets.emplace_back(edges_[e].j, edges_[e].i, off_diagonal_[e]);
  }
  Eigen::SparseMatrix<Scalar> matrix(order, order);
  matrix.setFromTriplets(triplets.begin(), triplets.end());
  auto lu = std::make_unique<Lu>();
  lu->factors.compute(matrix);
  if (lu->factors.info() != Eigen::Success) return false;
  lu_ = std::move(lu);
  return true;
}

template <typename Scalar>
void LaneRemedy<Scalar>::subtract_product(std::span<const Scalar> x, std::span<Scalar> from) const {
  for (std::size_t row = 0; row < diagonal_.size(); ++row) from[row] -= diagonal_[row] * x[row];
  for (std::size_t e = 0; e < edges_.size(); ++e) {
    from[at(edges_[e].i)] -= off_diagonal_[e] * x[at(edges_[e].j)];
    from[at(edges_[e].j)] -= off_diagonal_[e] * x[at(edges_[e].i)];
  }
}

template <typename Scalar>
void LaneRemedy<Scalar>::solve(std::span<Scalar> b, const PlainSolve& plain) const {
  using Vector = Eigen::Matrix<Scalar, Eigen::Dynamic, 1>;
  Eigen::Map<Vector> x(b.data(), static_cast<Eigen::Index>(b.size()));
  if (lu_) {
    const Vector solution = lu_->factors.solve(Vector(x));
    x = solution;
    return;
  }
  std::vector<Scalar> rest(b.begin(), b.end());
  plain(b);
  subtract_product(b, rest);
  plain(rest);
  for (std::size_t row = 0; row < b.size(); ++row) b[row] += rest[row];
}

template <typename Scalar>
double LaneRemedy<Scalar>::residual(std::span<const Scalar> x, std::span<const Scalar> b) const {
  std::vector<Scalar> rest(b.begin(), b.end());
  subtract_product(x, rest);
  double largest = 0;
  for (const Scalar value : rest) {
    const double size = std::abs(value);
    if (std::isnan(size)) return std::numeric_limits<double>::infinity();
    largest = std::max(largest, size);
  }
  return largest;
}

template <typename Scalar>
void LaneRemedy<Scalar>::invert(const PlainSolve& plain, const std::function<void(Index, Scalar)>& diagonal,
                                const std::function<void(Index, Scalar)>& off_diagonal) const {
  std::vector<std::vector<Index>> edges_at(diagonal_.size());
  for (std::size_t e = 0; e < edges_.size(); ++e) edges_at[at(edges_[e].i)].push_back(static_cast<Index>(e));
  std::vector<Scalar> column(diagonal_.size());
  for (std::size_t row = 0; row < diagonal_.size(); ++row) {
    std::fill(column.begin(), column.end(), Scalar(0));
    column[row] = 1;
    solve(column, plain);
    diagonal(static_cast<Index>(row), column[row]);
    for (const Index e : edges_at[row]) off_diagonal(e, column[at(edges_[at(e)].j)]);
  }
}

template class LaneRemedy<double>;
template class LaneRemedy<std::complex<double>>;

}  // namespace kiloamp::sparse
