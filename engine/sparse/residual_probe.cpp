#include "engine/sparse/residual_probe.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>

namespace kiloamp::sparse {
namespace {

/// Suspects probed at most: a handful of bad spots is found, a bad matrix needs no more proof.
constexpr std::size_t kMostSuspects = 14;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

constexpr int kBlock = kProbeBlock;

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

  Prober(ProbeSolver<Scalar, Lanes>& solver, const EliminationPlan& plan, const Values<Scalar, Lanes>& values)
      : plan_(plan), values_(values), solver_(solver) {}

  void probe(std::span<const Index> rows) {
    put(rows);
    solver_.solve();
    measure_magnification(rows);
    sums_.assign(at(plan_.order), Row{});
    for (std::size_t c = 0; c < rows.size(); ++c) start_with_unit(at(plan_.position_of[at(rows[c])]), c);
    for (Index p = 0; p < plan_.order; ++p) gather(p, values_.diagonal[at(plan_.row_of[at(p)])], p);
    for (std::size_t e = 0; e < plan_.edges; ++e) {
      const Index p = plan_.edge_column[e];
      const Index other = plan_.rows[at(plan_.edge_slot[e])];
      gather(p, values_.off_diagonal[e], other);
      gather(other, values_.off_diagonal[e], p);
    }
    measure_mismatch();
  }

  void probe_spot() {
    const auto& spot = plan_.spot;
    put(spot.columns);
    solver_.solve_at(spot.unknowns);
    measure_magnification(spot.columns);
    sums_.assign(spot.path.size(), Row{});
    for (std::size_t k = 0; k < spot.path.size(); ++k) {
      const Index row = plan_.row_of[at(spot.path[k])];
      for (std::size_t c = 0; c < spot.columns.size(); ++c) {
        if (spot.columns[c] == row) start_with_unit(k, c);
      }
      gather(static_cast<Index>(k), values_.diagonal[at(row)], spot.path[k]);
    }
    for (const auto& term : spot.terms)
      gather(term.place, values_.off_diagonal[at(term.edge)], term.position);
    measure_mismatch();
  }

  /// Largest (|A| |z|)_i of the columns probed last.
  void measure_rounding() {
    for (std::size_t s = 0; s < at(Lanes); ++s) {
      std::vector<Doubles<kBlock>> sizes(at(plan_.order), Doubles<kBlock>{});
      const auto add = [&](Index to, const Scalar& a, Index from) {
        sizes[at(to)] += parts(a) * parts(solver_.at_position(from)[s]);
      };
      for (Index p = 0; p < plan_.order; ++p) add(p, values_.diagonal[at(plan_.row_of[at(p)])][s], p);
      for (std::size_t e = 0; e < plan_.edges; ++e) {
        const Index p = plan_.edge_column[e];
        const Index other = plan_.rows[at(plan_.edge_slot[e])];
        add(p, values_.off_diagonal[e][s], other);
        add(other, values_.off_diagonal[e][s], p);
      }
      for (const Doubles<kBlock>& size : sizes) {
        for (int c = 0; c < kBlock; ++c) results_[s].include({0, or_infinite(size[c]), 0});
      }
    }
  }

  [[nodiscard]] const std::array<ProbeResult, Lanes>& results() const { return results_; }

 private:
  using Row = typename ProbeSolver<Scalar, Lanes>::Row;

  static int side(std::size_t c) { return static_cast<int>(c % kBlock); }

  void put(std::span<const Index> rows) {
    Entry one;
    one.fill(Scalar(1));
    solver_.clear();
    for (std::size_t c = 0; c < rows.size(); ++c) solver_.put(side(c), rows[c], one);
  }

  void measure_magnification(std::span<const Index> rows) {
    for (std::size_t c = 0; c < rows.size(); ++c) {
      const Entry z = solver_.get(side(c), rows[c]);
      for (std::size_t s = 0; s < at(Lanes); ++s) {
        results_[s].include({0, 0, or_infinite(parts(z[s] * values_.diagonal[at(rows[c])][s]))});
      }
    }
  }

  void start_with_unit(std::size_t place, std::size_t c) {
    for (auto& sum : sums_[place]) set_lane<kBlock>(sum.re, side(c), -1);
  }

  void measure_mismatch() {
    std::array<Doubles<kBlock>, static_cast<std::size_t>(Lanes)> worst{};
    std::array<Doubles<kBlock>, static_cast<std::size_t>(Lanes)> finite{};
    for (const Row& sum : sums_) {
      for (std::size_t s = 0; s < at(Lanes); ++s) {
        const Doubles<kBlock> mismatch = parts(sum[s]);
        worst[s] = larger(worst[s], mismatch);
        finite[s] += mismatch - mismatch;
      }
    }
    for (std::size_t s = 0; s < at(Lanes); ++s) {
      for (int c = 0; c < kBlock; ++c) results_[s].include({or_infinite(worst[s][c] + finite[s][c]), 0, 0});
    }
  }

  void gather(Index to, const Entry& a, Index from) {
    const Row& x = solver_.at_position(from);
    for (std::size_t s = 0; s < at(Lanes); ++s) accumulate(sums_[at(to)][s], a[s], x[s]);
  }

  const EliminationPlan& plan_;
  const Values<Scalar, Lanes>& values_;
  ProbeSolver<Scalar, Lanes>& solver_;
  std::array<ProbeResult, Lanes> results_{};
  std::vector<Row> sums_;  // A z - b
};

}  // namespace

void ProbeResult::include(const ProbeResult& other) {
  residual = std::max(residual, other.residual);
  rounding = std::max(rounding, other.rounding);
  magnification = std::max(magnification, other.magnification);
}

template <typename Scalar, int Lanes>
std::array<ProbeResult, Lanes> probe_columns(ProbeSolver<Scalar, Lanes>& solver, const EliminationPlan& plan,
                                             const Values<Scalar, Lanes>& values,
                                             std::span<const Index> rows) {
  Prober<Scalar, Lanes> prober(solver, plan, values);
  if (rows.empty()) return prober.results();
  prober.probe(rows);
  if (!is_clean(prober.results())) prober.measure_rounding();
  return prober.results();
}

template <typename Scalar, int Lanes>
std::array<ProbeResult, Lanes> probe_spot(ProbeSolver<Scalar, Lanes>& solver, const EliminationPlan& plan,
                                          const Values<Scalar, Lanes>& values) {
  Prober<Scalar, Lanes> prober(solver, plan, values);
  prober.probe_spot();
  return prober.results();
}

template <typename Scalar, int Width>
bool is_sound(const LaneFactors<Scalar, Width>& factors, int lanes) {
  for (const auto& watch : factors.watches) {
    for (int lane = 0; lane < lanes; ++lane) {
      if (!(watch.grown[at(lane)] == 0)) return false;
      if (watch.worst[at(lane)][0].squared > kSuspectGrowth * kSuspectGrowth) return false;
    }
  }
  return true;
}

template <typename Scalar, int Width>
std::vector<Index> rows_to_probe(const LaneFactors<Scalar, Width>& factors, int lanes) {
  struct Suspect {
    double mark;
    Index step;
    int lane;
  };
  std::vector<Suspect> suspects;
  for (const auto& watch : factors.watches) {
    for (int lane = 0; lane < lanes; ++lane) {
      for (const auto& mark : watch.worst[at(lane)]) {
        if (mark.squared > kSuspectGrowth * kSuspectGrowth)
          suspects.push_back({mark.squared, mark.step, lane});
      }
    }
  }
  std::stable_sort(suspects.begin(), suspects.end(),
                   [](const auto& a, const auto& b) { return a.mark > b.mark; });
  const EliminationPlan& plan = *factors.plan;
  std::vector<Index> rows;
  const auto add = [&](Index row) {
    if (std::find(rows.begin(), rows.end(), row) == rows.end()) rows.push_back(row);
  };
  for (const Suspect& one : suspects) {
    if (rows.size() < kMostSuspects) add(plan.row_of[at(worst_pivot(factors, one.step, one.lane))]);
  }
  for (const Index row : plan.spot.columns) add(row);
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

#define KILOAMP_INSTANTIATE(Scalar, Lanes)                                               \
  template std::array<ProbeResult, Lanes> probe_columns<Scalar, Lanes>(                  \
      ProbeSolver<Scalar, Lanes>&, const EliminationPlan&, const Values<Scalar, Lanes>&, \
      std::span<const Index>);                                                           \
  template std::array<ProbeResult, Lanes> probe_spot<Scalar, Lanes>(                     \
      ProbeSolver<Scalar, Lanes>&, const EliminationPlan&, const Values<Scalar, Lanes>&);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 3)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE
#define KILOAMP_INSTANTIATE(Scalar, Width)                                                          \
  template std::vector<Index> rows_to_probe<Scalar, Width>(const LaneFactors<Scalar, Width>&, int); \
  template bool is_sound<Scalar, Width>(const LaneFactors<Scalar, Width>&, int);                    \
  template Index worst_row<Scalar, Width>(const LaneFactors<Scalar, Width>&, int);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE

}  // namespace kiloamp::sparse
