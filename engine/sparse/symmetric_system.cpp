#include "engine/sparse/symmetric_system.hpp"

#include <Eigen/SparseLU>
#include <algorithm>
#include <cmath>

namespace kiloamp::sparse {

struct Analysis::Body {
  Index order = 0;
  std::vector<Edge> edges;
};

Analysis::Analysis(Index order, std::span<const Edge> edges)
    : body_(new Body{order, std::vector<Edge>(edges.begin(), edges.end())}) {}
Analysis::~Analysis() = default;
Index Analysis::order() const { return body_->order; }
std::span<const Edge> Analysis::edges() const { return body_->edges; }

template <typename Scalar, int Lanes>
struct Factorisation<Scalar, Lanes>::Body {
  using Matrix = Eigen::SparseMatrix<Scalar, Eigen::ColMajor, Index>;
  using Vector = Eigen::Matrix<Scalar, Eigen::Dynamic, 1>;
  std::shared_ptr<const Analysis> analysis;
  std::array<Matrix, Lanes> matrices;
  std::array<Eigen::SparseLU<Matrix, Eigen::COLAMDOrdering<Index>>, Lanes> factors;
  std::array<Accuracy, Lanes> accuracy;

  [[nodiscard]] Vector column(int lane, Index k) const {
    Vector unit = Vector::Zero(analysis->order());
    unit[k] = Scalar(1);
    return factors[static_cast<std::size_t>(lane)].solve(unit);
  }
};

template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::Factorisation(std::shared_ptr<const Analysis> analysis,
                                            const Values<Scalar, Lanes>& values, int /*threads*/)
    : body_(std::make_unique<Body>()) {
  body_->analysis = std::move(analysis);
  const Index n = body_->analysis->order();
  const auto edges = body_->analysis->edges();
  for (std::size_t lane = 0; lane < Lanes; ++lane) {
    std::vector<Eigen::Triplet<Scalar, Index>> triplets;
    triplets.reserve(values.diagonal.size() + 2 * edges.size());
    for (Index i = 0; i < n; ++i)
      triplets.emplace_back(i, i, values.diagonal[static_cast<std::size_t>(i)][lane]);
    for (std::size_t e = 0; e < edges.size(); ++e) {
      triplets.emplace_back(edges[e].i, edges[e].j, values.off_diagonal[e][lane]);
      triplets.emplace_back(edges[e].j, edges[e].i, values.off_diagonal[e][lane]);
    }
    auto& matrix = body_->matrices[lane];
    matrix.resize(n, n);
    matrix.setFromTriplets(triplets.begin(), triplets.end());
    if (n == 0) continue;
    auto& lu = body_->factors[lane];
    lu.compute(matrix);
    if (lu.info() != Eigen::Success) throw NumericalError("singular matrix", 0, static_cast<int>(lane));
    body_->accuracy[lane].pivoting = true;
    for (const Index k : {Index{0}, n / 2, n - 1}) {
      const auto z = body_->column(static_cast<int>(lane), k);
      auto r = (matrix * z).eval();
      r[k] -= Scalar(1);
      const double residual = r.cwiseAbs().maxCoeff();
      if (!(residual < 1e-6))
        throw NumericalError("the solution does not satisfy its equations", k, static_cast<int>(lane));
      body_->accuracy[lane].residual = std::max(body_->accuracy[lane].residual, residual);
    }
  }
}

template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::~Factorisation() = default;
template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::Factorisation(Factorisation&&) noexcept = default;
template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>& Factorisation<Scalar, Lanes>::operator=(Factorisation&&) noexcept = default;

template <typename Scalar, int Lanes>
const std::array<Accuracy, Lanes>& Factorisation<Scalar, Lanes>::accuracy() const {
  return body_->accuracy;
}

template <typename Scalar, int Lanes>
auto Factorisation<Scalar, Lanes>::selected_inverse(int /*threads*/) const -> SelectedInverse {
  const Index n = body_->analysis->order();
  const auto edges = body_->analysis->edges();
  SelectedInverse inverse;
  inverse.diagonal.resize(static_cast<std::size_t>(n));
  inverse.off_diagonal.resize(edges.size());
  std::vector<std::vector<std::size_t>> edges_at(static_cast<std::size_t>(n));
  for (std::size_t e = 0; e < edges.size(); ++e) edges_at[static_cast<std::size_t>(edges[e].j)].push_back(e);
  std::vector<Entry> z(static_cast<std::size_t>(n));
  for (Index k = 0; k < n; ++k) {
    column(k, z);
    inverse.diagonal[static_cast<std::size_t>(k)] = z[static_cast<std::size_t>(k)];
    for (const std::size_t e : edges_at[static_cast<std::size_t>(k)])
      inverse.off_diagonal[e] = z[static_cast<std::size_t>(edges[e].i)];
  }
  return inverse;
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::column(Index k, std::span<Entry> out) const {
  for (int lane = 0; lane < Lanes; ++lane) {
    const auto z = body_->column(lane, k);
    for (std::size_t i = 0; i < out.size(); ++i)
      out[i][static_cast<std::size_t>(lane)] = z[static_cast<Eigen::Index>(i)];
  }
}

template <typename Scalar, int Lanes>
auto Factorisation<Scalar, Lanes>::inverse_entry(Index i, Index j) const -> Entry {
  Entry entry;
  for (int lane = 0; lane < Lanes; ++lane) entry[static_cast<std::size_t>(lane)] = body_->column(lane, j)[i];
  return entry;
}

template class Factorisation<std::complex<double>, 1>;
template class Factorisation<std::complex<double>, 3>;
template class Factorisation<double, 1>;
template class Factorisation<double, 2>;

}  // namespace kiloamp::sparse
