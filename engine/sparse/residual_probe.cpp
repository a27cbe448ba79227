#include "engine/sparse/residual_probe.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>

namespace kiloamp::sparse {
namespace {

/// Suspects probed at most: a handful of bad spots is found, a bad matrix needs no more proof.
constexpr std::size_t kMostSuspects = 14;
/// Below this the share of rounding in a mismatch is not worth measuring.
constexpr double kCleanResidual = 1e-10;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

constexpr int kBlock = 2;

double parts(double value) { return std::abs(value); }
double parts(std::complex<double> value) { return std::abs(value.real()) + std::abs(value.imag()); }
Doubles<kBlock> parts(const Pack<double, kBlock>& value) { return larger(value.re, -value.re); }
Doubles<kBlock> parts(const Pack<std::complex<double>, kBlock>& value) {
  return larger(value.re, -value.re) + larger(value.im, -value.im);
}

double or_infinite(double value) { return std::isnan(value) ? kInfinite : value; }

/// to += a x for all right-hand sides.
void accumulate(Pack<double, kBlock>& to, double a, const Pack<double, kBlock>& x) { to.re += a * x.re; }
void accumulate(Pack<std::complex<double>, kBlock>& to, std::complex<double> a,
                const Pack<std::complex<double>, kBlock>& x) {
  to.re += a.real() * x.re;
  to.re -= a.imag() * x.im;
  to.im += a.real() * x.im;
  to.im += a.imag() * x.re;
}

template <typename Scalar, int Lanes>
class Prober {
 public:
  using Entry = std::array<Scalar, Lanes>;

  Prober(const LaneFactors<Scalar, padded_width(Lanes)>& factors, const Values<Scalar, Lanes>& values)
      : plan_(*factors.plan), values_(values), solver_(factors), sums_(at(plan_.order)) {}

  void probe(std::span<const Index> rows, std::array<ProbeResult, Lanes>& results) {
    Entry one;
    one.fill(Scalar(1));
    solver_.clear();
    const auto side = [](std::size_t r) { return static_cast<int>(r % kBlock); };
    for (std::size_t r = 0; r < rows.size(); ++r) solver_.put(side(r), rows[r], one);
    solver_.solve();
    std::fill(sums_.begin(), sums_.end(), Row{});
    for (std::size_t c = 0; c < rows.size(); ++c) {
      for (auto& sum : sums_[at(plan_.position_of[at(rows[c])])]) set_lane<kBlock>(sum.re, side(c), -1);
      const Entry z = solver_.get(side(c), rows[c]);
      for (std::size_t s = 0; s < at(Lanes); ++s) {
        results[s].include({0, 0, or_infinite(parts(z[s] * values_.diagonal[at(rows[c])][s]))});
      }
    }
    std::array<Doubles<kBlock>, static_cast<std::size_t>(Lanes)> worst{};
    std::array<Doubles<kBlock>, static_cast<std::size_t>(Lanes)> finite{};
    for (Index p = 0; p < plan_.order; ++p) {
      gather(p, values_.diagonal[at(plan_.row_of[at(p)])], p);
      for (Index slot = plan_.column_begin[at(p)]; slot < plan_.diagonal_slot(p); ++slot) {
        const Index edge = plan_.source[at(slot)];
        if (edge < 0) continue;
        gather(p, values_.off_diagonal[at(edge)], plan_.rows[at(slot)]);
        gather(plan_.rows[at(slot)], values_.off_diagonal[at(edge)], p);
      }
      for (std::size_t s = 0; s < at(Lanes); ++s) {
        const Doubles<kBlock> mismatch = parts(sums_[at(p)][s]);
        worst[s] = larger(worst[s], mismatch);
        finite[s] += mismatch - mismatch;
      }
    }
    for (std::size_t s = 0; s < at(Lanes); ++s) {
      for (int c = 0; c < kBlock; ++c) results[s].include({or_infinite(worst[s][c] + finite[s][c]), 0, 0});
    }
  }

  /// Largest (|A| |z|)_i of the columns probed last.
  void measure_rounding(std::array<ProbeResult, Lanes>& results) const {
    for (std::size_t s = 0; s < at(Lanes); ++s) {
      std::vector<Doubles<kBlock>> sizes(at(plan_.order), Doubles<kBlock>{});
      for (Index p = 0; p < plan_.order; ++p) {
        const Doubles<kBlock> mine = parts(solver_.at_position(p)[s]);
        sizes[at(p)] += parts(values_.diagonal[at(plan_.row_of[at(p)])][s]) * mine;
        for (Index slot = plan_.column_begin[at(p)]; slot < plan_.diagonal_slot(p); ++slot) {
          const Index edge = plan_.source[at(slot)];
          if (edge < 0) continue;
          const Index other = plan_.rows[at(slot)];
          const double a = parts(values_.off_diagonal[at(edge)][s]);
          sizes[at(p)] += a * parts(solver_.at_position(other)[s]);
          sizes[at(other)] += a * mine;
        }
        for (int c = 0; c < kBlock; ++c) results[s].include({0, or_infinite(sizes[at(p)][c]), 0});
      }
    }
  }

 private:
  using Row = typename ColumnSolver<Scalar, Lanes, kBlock>::Row;

  void gather(Index to, const Entry& a, Index from) {
    const Row& x = solver_.at_position(from);
    for (std::size_t s = 0; s < at(Lanes); ++s) accumulate(sums_[at(to)][s], a[s], x[s]);
  }

  const EliminationPlan& plan_;
  const Values<Scalar, Lanes>& values_;
  ColumnSolver<Scalar, Lanes, kBlock> solver_;
  std::vector<Row> sums_;
};

}  // namespace

void ProbeResult::include(const ProbeResult& other) {
  residual = std::max(residual, other.residual);
  rounding = std::max(rounding, other.rounding);
  magnification = std::max(magnification, other.magnification);
}

template <typename Scalar, int Lanes>
std::array<ProbeResult, Lanes> probe_columns(const LaneFactors<Scalar, padded_width(Lanes)>& factors,
                                             const Values<Scalar, Lanes>& values,
                                             std::span<const Index> rows) {
  std::array<ProbeResult, Lanes> results{};
  Prober<Scalar, Lanes> prober(factors, values);
  if (rows.empty()) return results;
  prober.probe(rows, results);
  const bool doubtful =
      std::ranges::any_of(results, [](const auto& one) { return !(one.residual <= kCleanResidual); });
  if (doubtful) prober.measure_rounding(results);
  return results;
}

template <typename Scalar, int Width>
std::vector<Index> rows_to_probe(const LaneFactors<Scalar, Width>& factors, int lanes, double suspect) {
  struct Suspect {
    double mark;
    Index step;
    int lane;
  };
  std::vector<Suspect> suspects;
  for (const auto& watch : factors.watches) {
    for (int lane = 0; lane < lanes; ++lane) {
      for (const auto& mark : watch.worst[at(lane)]) {
        if (mark.squared > suspect * suspect) suspects.push_back({mark.squared, mark.step, lane});
      }
    }
  }
  std::stable_sort(suspects.begin(), suspects.end(),
                   [](const auto& a, const auto& b) { return a.mark > b.mark; });
  const EliminationPlan& plan = *factors.plan;
  std::vector<Index> rows;
  const auto add = [&](Index position) {
    const Index row = plan.row_of[at(position)];
    if (std::find(rows.begin(), rows.end(), row) == rows.end()) rows.push_back(row);
  };
  if (plan.order == 0) return rows;
  for (const Suspect& one : suspects) {
    if (rows.size() < kMostSuspects) add(worst_pivot(factors, one.step, one.lane));
  }
  add(plan.order - 1);
  add(plan.order / 2);
  return rows;
}

template <typename Scalar, int Width>
Index worst_row(const LaneFactors<Scalar, Width>& factors, int lane) {
  typename PivotWatch<Width>::Mark worst;
  for (const auto& watch : factors.watches) {
    if (watch.worst[at(lane)][0].squared > worst.squared) worst = watch.worst[at(lane)][0];
  }
  return worst.step < 0 ? 0 : factors.plan->row_of[at(worst_pivot(factors, worst.step, lane))];
}

#define KILOAMP_INSTANTIATE(Scalar, Lanes)                                           \
  template std::array<ProbeResult, Lanes> probe_columns<Scalar, Lanes>(              \
      const LaneFactors<Scalar, padded_width(Lanes)>&, const Values<Scalar, Lanes>&, \
      std::span<const Index>);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 3)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE
#define KILOAMP_INSTANTIATE(Scalar, Width)                                                                  \
  template std::vector<Index> rows_to_probe<Scalar, Width>(const LaneFactors<Scalar, Width>&, int, double); \
  template Index worst_row<Scalar, Width>(const LaneFactors<Scalar, Width>&, int);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE

}  // namespace kiloamp::sparse
