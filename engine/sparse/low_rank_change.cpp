#include "engine/sparse/low_rank_change.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cassert>
#include <limits>

namespace kiloamp::sparse {
namespace {

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

}  // namespace

template <typename Scalar, int Lanes>
LowRankChange<Scalar, Lanes>::LowRankChange(const Factorisation<Scalar, Lanes>& factorisation,
                                            std::span<const SparseVector<Scalar, Lanes>> u,
                                            std::span<const Entry> d)
    : order_(at(factorisation.analysis().order())),
      rank_(static_cast<int>(u.size())),
      w_(u.size() * order_),
      gain_(u.size() * u.size()) {
  assert(d.size() == u.size() * u.size());
  auto solver = factorisation.sparse_solver();
  constexpr std::size_t kBlock = kWideBlock;
  for (std::size_t from = 0; from < u.size(); from += kBlock) {
    const std::size_t count = std::min(kBlock, u.size() - from);
    solver.clear();
    for (std::size_t b = 0; b < count; ++b) {
      for (const auto& term : u[from + b]) solver.put(static_cast<int>(b), term.row, term.value);
    }
    solver.solve();
    for (std::size_t b = 0; b < count; ++b) {
      solver.copy(static_cast<int>(b), std::span<Entry>(w_).subspan((from + b) * order_, order_));
    }
  }
  for (int lane = 0; lane < Lanes; ++lane) find_gain(lane, u, d);
}

template <typename Scalar, int Lanes>
void LowRankChange<Scalar, Lanes>::find_gain(int lane, std::span<const SparseVector<Scalar, Lanes>> u,
                                             std::span<const Entry> d) {
  using Matrix = Eigen::Matrix<Scalar, Eigen::Dynamic, Eigen::Dynamic>;
  if (rank_ == 0) return;
  const std::size_t s = at(lane);
  Matrix projected = Matrix::Zero(rank_, rank_);  // U^T Z U
  Eigen::MatrixXd sizes = Eigen::MatrixXd::Zero(rank_, rank_);
  Matrix change(rank_, rank_);
  for (int a = 0; a < rank_; ++a) {
    for (int b = 0; b < rank_; ++b) {
      for (const auto& term : u[at(a)]) {
        const Scalar part = term.value[s] * w_[at(b) * order_ + at(term.row)][s];
        projected(a, b) += part;
        sizes(a, b) += std::abs(part);
      }
      change(a, b) = d[at(a * rank_ + b)][s];
    }
  }
  const Matrix system = Matrix::Identity(rank_, rank_) + change * projected;
  const double roundings = 1 + (change.cwiseAbs() * sizes).cwiseAbs().maxCoeff();
  const Eigen::JacobiSVD<Matrix> svd(system);
  const double smallest = svd.singularValues().minCoeff();
  const bool splits = !(smallest > kSplitMargin * std::numeric_limits<double>::epsilon() * roundings);
  outcome_[s] = splits ? ChangeOutcome::kSplits : ChangeOutcome::kSolved;
  const Matrix gain = splits ? Matrix::Constant(rank_, rank_, std::numeric_limits<double>::quiet_NaN())
                             : Matrix(system.fullPivLu().solve(change));
  for (int a = 0; a < rank_; ++a) {
    for (int b = 0; b < rank_; ++b) gain_[at(a * rank_ + b)][s] = gain(a, b);
  }
}

template <typename Scalar, int Lanes>
typename LowRankChange<Scalar, Lanes>::Entry LowRankChange<Scalar, Lanes>::changed_entry(
    Index i, Index j, const Entry& before) const {
  Entry after = before;
  for (int a = 0; a < rank_; ++a) {
    const Entry& left = w_[at(a) * order_ + at(i)];
    for (int b = 0; b < rank_; ++b) {
      const Entry& right = w_[at(b) * order_ + at(j)];
      for (std::size_t s = 0; s < at(Lanes); ++s)
        after[s] -= left[s] * gain_[at(a * rank_ + b)][s] * right[s];
    }
  }
  return after;
}

template <typename Scalar, int Lanes>
void LowRankChange<Scalar, Lanes>::change_diagonal(std::span<Entry> diagonal) const {
  assert(diagonal.size() == order_);
  for (std::size_t row = 0; row < order_; ++row) {
    const auto i = static_cast<Index>(row);
    diagonal[row] = changed_entry(i, i, diagonal[row]);
  }
}

template <typename Scalar, int Lanes>
void LowRankChange<Scalar, Lanes>::change(std::span<const Edge> edges,
                                          InverseOnPattern<Scalar, Lanes>& inverse) const {
  change_diagonal(inverse.diagonal);
  for (std::size_t e = 0; e < edges.size(); ++e) {
    inverse.off_diagonal[e] = changed_entry(edges[e].i, edges[e].j, inverse.off_diagonal[e]);
  }
}

template <typename Scalar, int Lanes>
std::span<const typename LowRankChange<Scalar, Lanes>::Entry> LowRankChange<Scalar, Lanes>::response(
    int b) const {
  return std::span<const Entry>(w_).subspan(at(b) * order_, order_);
}

template class LowRankChange<std::complex<double>, 1>;
template class LowRankChange<std::complex<double>, 3>;
template class LowRankChange<std::complex<double>, 4>;
template class LowRankChange<double, 1>;
template class LowRankChange<double, 2>;
template class LowRankChange<double, 4>;

}  // namespace kiloamp::sparse
