#include "engine/sparse/factorisation.hpp"

#include <cassert>
#include <cmath>
#include <limits>
#include <mutex>
#include <string>

#include "engine/sparse/lane_remedy.hpp"
#include "engine/sparse/residual_probe.hpp"

namespace kiloamp::sparse {
namespace {

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

}  // namespace

template <typename Scalar, int Lanes>
struct Factorisation<Scalar, Lanes>::Body {
  static constexpr int kWidth = padded_width(Lanes);
  using Solver = ColumnSolver<Scalar, Lanes>;

  std::shared_ptr<const Analysis> analysis;
  LaneFactors<Scalar, kWidth> factors;
  ProbeSolver<Scalar, Lanes> probe_solver;
  EliminationWorkspace<Scalar> elimination_workspace;
  std::mutex inverse_guard;  // selected_inverse() is const: several threads may ask at once
  InverseWorkspace<Scalar, kWidth> inverse_workspace;
  std::array<Accuracy, Lanes> accuracy{};
  std::array<std::unique_ptr<LaneRemedy<Scalar>>, Lanes> remedies{};

  explicit Body(std::shared_ptr<const Analysis> shared)
      : analysis(std::move(shared)), factors(analysis->plan()), probe_solver(factors) {}

  /// A solver by the lane's plain factors for LaneRemedy.
  typename LaneRemedy<Scalar>::PlainSolve plain_solve(int lane) const {
    return [this, lane, solver = std::make_shared<Solver>(factors)](std::span<Scalar> b) {
      solver->clear();
      for (std::size_t row = 0; row < b.size(); ++row) {
        if (b[row] == Scalar(0)) continue;
        Entry value{};
        value[at(lane)] = b[row];
        solver->put(0, static_cast<Index>(row), value);
      }
      solver->solve();
      for (std::size_t row = 0; row < b.size(); ++row)
        b[row] = solver->get(0, static_cast<Index>(row))[at(lane)];
    };
  }

  void measure(const Values<Scalar, Lanes>& values);
  void probe_in_full(const Values<Scalar, Lanes>& values);
  void mend(const Values<Scalar, Lanes>& values, int lane, std::span<const Index> rows);
  double remedy_residual(int lane, std::span<const Index> rows) const;
  [[noreturn]] void fail(int lane, const char* why) const;
};

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::Body::fail(int lane, const char* why) const {
  const Index row = worst_row(factors, lane);
  throw NumericalError(
      std::string(why) + " (matrix row " + std::to_string(row) + ", lane " + std::to_string(lane) + ")", row,
      lane);
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::Body::measure(const Values<Scalar, Lanes>& values) {
  accuracy = {};
  for (auto& remedy : remedies) remedy.reset();
  for (std::size_t s = 0; s < at(Lanes); ++s) {
    double input = 0;
    double met = 0;
    double worst = 0;
    for (const auto& largest : factors.largest_input_squared) {
      if (std::isnan(largest[s])) {
        throw NumericalError("the matrix has an entry that is not a finite number", 0, static_cast<int>(s));
      }
      input = std::max(input, largest[s]);
    }
    for (const auto& watch : factors.watches) {
      met = std::max(met, watch.largest_squared[s]);
      worst = std::max(worst, watch.worst[s][0].squared);
    }
    accuracy[s].growth = input > 0 ? std::max(1.0, std::sqrt(met / input)) : 1;
    accuracy[s].worst_pivot_ratio = std::sqrt(worst);
  }
  if (is_sound(factors, Lanes)) {
    const auto results = probe_spot<Scalar, Lanes>(probe_solver, *factors.plan, values);
    const bool settled = is_clean(results) && std::ranges::all_of(results, [](const ProbeResult& result) {
                           return result.magnification <= kSingularMagnification;
                         });
    if (settled) {
      for (std::size_t s = 0; s < at(Lanes); ++s) accuracy[s].residual = results[s].residual;
      return;
    }
  }
  probe_in_full(values);
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::Body::probe_in_full(const Values<Scalar, Lanes>& values) {
  const std::vector<Index> rows = rows_to_probe(factors, Lanes);
  const auto results = probe_columns<Scalar, Lanes>(probe_solver, *factors.plan, values, rows);
  for (int s = 0; s < Lanes; ++s) {
    const ProbeResult& result = results[at(s)];
    accuracy[at(s)].residual = result.residual;
    const double floor = kRoundingMargin * std::numeric_limits<double>::epsilon() * result.rounding;
    const double excused = std::isfinite(result.rounding) ? floor : 0;
    if (!(result.residual <= std::max(kTrustedResidual, excused))) mend(values, s, rows);
    if (!(accuracy[at(s)].residual <= kSingularResidual))
      fail(s, "singular to working precision: no accurate solution");
    if (!accuracy[at(s)].pivoting && !(result.magnification <= kSingularMagnification)) {
      fail(s, "singular to working precision: a row cancels to rounding noise");
    }
  }
}

template <typename Scalar, int Lanes>
double Factorisation<Scalar, Lanes>::Body::remedy_residual(int lane, std::span<const Index> rows) const {
  double largest = 0;
  const auto plain = plain_solve(lane);
  std::vector<Scalar> unit(at(analysis->order()));
  for (const Index row : rows) {
    std::fill(unit.begin(), unit.end(), Scalar(0));
    unit[at(row)] = 1;
    std::vector<Scalar> column = unit;
    remedies[at(lane)]->solve(column, plain);
    largest = std::max(largest, remedies[at(lane)]->residual(column, unit));
  }
  return largest;
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::Body::mend(const Values<Scalar, Lanes>& values, int lane,
                                              std::span<const Index> rows) {
  std::vector<Scalar> diagonal(values.diagonal.size());
  std::vector<Scalar> off_diagonal(values.off_diagonal.size());
  for (std::size_t k = 0; k < diagonal.size(); ++k) diagonal[k] = values.diagonal[k][at(lane)];
  for (std::size_t k = 0; k < off_diagonal.size(); ++k) off_diagonal[k] = values.off_diagonal[k][at(lane)];
  auto& remedy = remedies[at(lane)];
  remedy =
      std::make_unique<LaneRemedy<Scalar>>(analysis->edges(), std::move(diagonal), std::move(off_diagonal));
  Accuracy& result = accuracy[at(lane)];
  result.residual = remedy_residual(lane, rows);
  result.refined = result.residual <= kTrustedResidual;
  if (result.refined) return;
  if (!remedy->pivot()) fail(lane, "singular: no pivot left");
  result.residual = remedy_residual(lane, rows);
  result.pivoting = true;
}

template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::Factorisation(std::shared_ptr<const Analysis> analysis,
                                            const Values<Scalar, Lanes>& values, int threads)
    : body_(std::make_unique<Body>(std::move(analysis))) {
  refactorise(values, threads);
}

template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::~Factorisation() = default;
template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::Factorisation(Factorisation&&) noexcept = default;
template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>& Factorisation<Scalar, Lanes>::operator=(Factorisation&&) noexcept = default;

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::refactorise(const Values<Scalar, Lanes>& values, int threads) {
  assert(values.diagonal.size() == at(body_->analysis->order()));
  assert(values.off_diagonal.size() == body_->analysis->edges().size());
  eliminate<Scalar, Lanes>(body_->factors, body_->elimination_workspace, values, threads);
  body_->measure(values);
}

template <typename Scalar, int Lanes>
const Analysis& Factorisation<Scalar, Lanes>::analysis() const {
  return *body_->analysis;
}

template <typename Scalar, int Lanes>
const std::array<Accuracy, Lanes>& Factorisation<Scalar, Lanes>::accuracy() const {
  return body_->accuracy;
}

template <typename Scalar, int Lanes>
typename Factorisation<Scalar, Lanes>::SelectedInverse Factorisation<Scalar, Lanes>::selected_inverse(
    int threads) const {
  SelectedInverse out;
  selected_inverse(out, threads);
  return out;
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::selected_inverse(SelectedInverse& out, int threads) const {
  {
    const std::lock_guard lock(body_->inverse_guard);
    invert_on_pattern<Scalar, Lanes>(body_->factors, body_->inverse_workspace, out, threads);
  }
  for (int s = 0; s < Lanes; ++s) {
    const auto& remedy = body_->remedies[at(s)];
    if (!remedy) continue;
    remedy->invert(
        body_->plain_solve(s), [&](Index row, Scalar z) { out.diagonal[at(row)][at(s)] = z; },
        [&](Index edge, Scalar z) { out.off_diagonal[at(edge)][at(s)] = z; });
  }
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::column(Index k, std::span<Entry> out) const {
  columns(std::span<const Index>(&k, 1), out);
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::columns(std::span<const Index> rows, std::span<Entry> out) const {
  const std::size_t order = at(analysis().order());
  assert(out.size() == rows.size() * order);
  SparseSolver solver(*this);
  Entry one;
  one.fill(Scalar(1));
  constexpr std::size_t kBlock = SparseSolver::kBlock;
  for (std::size_t from = 0; from < rows.size(); from += kBlock) {
    const std::size_t count = std::min(kBlock, rows.size() - from);
    solver.clear();
    for (std::size_t c = 0; c < count; ++c) solver.put(static_cast<int>(c), rows[from + c], one);
    solver.solve();
    for (std::size_t c = 0; c < count; ++c)
      solver.copy(static_cast<int>(c), out.subspan((from + c) * order, order));
  }
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::solve(std::span<Entry> b) const {
  assert(b.size() == at(analysis().order()));
  SparseSolver solver(*this);
  for (std::size_t row = 0; row < b.size(); ++row) {
    if (b[row] != Entry{}) solver.put(0, static_cast<Index>(row), b[row]);
  }
  solver.solve();
  solver.copy(0, b);
}

template <typename Scalar, int Lanes>
typename Factorisation<Scalar, Lanes>::Entry Factorisation<Scalar, Lanes>::inverse_entry(Index i,
                                                                                         Index j) const {
  SparseSolver solver(*this);
  Entry one;
  one.fill(Scalar(1));
  solver.put(0, j, one);
  solver.solve_at(std::span<const Index>(&i, 1));
  return solver.get(0, i);
}

template <typename Scalar, int Lanes>
const LaneFactors<Scalar, padded_width(Lanes)>& Factorisation<Scalar, Lanes>::plain_factors() const {
  return body_->factors;
}

template <typename Scalar, int Lanes>
typename Factorisation<Scalar, Lanes>::SparseSolver Factorisation<Scalar, Lanes>::sparse_solver() const {
  return SparseSolver(*this);
}

template <typename Scalar, int Lanes>
Factorisation<Scalar, Lanes>::SparseSolver::SparseSolver(const Factorisation& factorisation)
    : body_(factorisation.body_.get()), plain_(body_->factors) {}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::clear() {
  plain_.clear();
  right_hand_sides_.clear();
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::put(int which, Index row, const Entry& value) {
  plain_.put(which, row, value);
  right_hand_sides_.push_back({which, {row, value}});
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::mend() {
  for (int s = 0; s < Lanes; ++s) {
    if (!body_->remedies[at(s)]) continue;
    const auto plain = body_->plain_solve(s);
    for (int which = 0; which < kBlock; ++which) {
      std::vector<Scalar> x(at(body_->analysis->order()), Scalar(0));
      bool any = false;
      for (const auto& [owner, term] : right_hand_sides_) {
        if (owner != which) continue;
        x[at(term.row)] += term.value[at(s)];
        any = true;
      }
      if (!any) continue;
      body_->remedies[at(s)]->solve(x, plain);
      for (std::size_t row = 0; row < x.size(); ++row) plain_.set(which, static_cast<Index>(row), s, x[row]);
    }
  }
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::solve() {
  plain_.solve();
  mend();
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::solve_at(std::span<const Index> wanted) {
  plain_.solve_at(wanted);
  mend();
}

template <typename Scalar, int Lanes>
typename Factorisation<Scalar, Lanes>::Entry Factorisation<Scalar, Lanes>::SparseSolver::get(
    int which, Index row) const {
  return plain_.get(which, row);
}

template <typename Scalar, int Lanes>
void Factorisation<Scalar, Lanes>::SparseSolver::copy(int which, std::span<Entry> out) const {
  plain_.copy(which, out);
}

template class Factorisation<std::complex<double>, 1>;
template class Factorisation<std::complex<double>, 3>;
template class Factorisation<std::complex<double>, 4>;
template class Factorisation<double, 1>;
template class Factorisation<double, 2>;
template class Factorisation<double, 4>;

}  // namespace kiloamp::sparse
