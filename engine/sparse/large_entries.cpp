#include "engine/sparse/large_entries.hpp"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numeric>

namespace kiloamp::sparse {
namespace {

// What rounding may add to a bound of a few hundred factors.
constexpr double kSlack = 1 + 1e-9;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

}  // namespace

template <typename Scalar, int Lanes>
LargeEntries<Scalar, Lanes>::LargeEntries(const LaneFactors<Scalar, padded_width(Lanes)>& factors, int lane,
                                          std::span<const double> floor)
    : plan_(factors.plan.get()) {
  const std::size_t n = at(plan_->order);
  floor_.resize(n);
  growth_.assign(n, 0);
  x_.resize(n);
  size_.resize(n);
  entry_.reserve(at(plan_->slots()));
  for (Index slot = 0; slot < plan_->slots(); ++slot)
    entry_.push_back(lane_of<Scalar, padded_width(Lanes)>(factors.slots[at(slot)], lane));
  on_path_.assign(n, false);
  child_begin_.assign(n + 1, 0);
  for (std::size_t p = 0; p < n; ++p) {
    floor_[p] = floor[at(plan_->row_of[p])];
    const Index parent = plan_->parent(static_cast<Index>(p));
    if (parent >= 0) ++child_begin_[at(parent) + 1];
  }
  std::partial_sum(child_begin_.begin(), child_begin_.end(), child_begin_.begin());
  children_.resize(at(child_begin_.back()));
  least_floor_ = floor_;
  std::vector<Index> next(child_begin_.begin(), child_begin_.end() - 1);
  // Children stand before their parents: growth_[p] holds the largest G of p's children until p's turn.
  for (Index p = 0; p < plan_->order; ++p) {
    double sum = 0;
    for (Index slot = plan_->column_begin[at(p)]; slot < plan_->diagonal_slot(p); ++slot)
      sum += std::abs(entry_[at(slot)]);
    growth_[at(p)] = kSlack * std::max(sum, std::max(1.0, sum) * growth_[at(p)]);
    const Index parent = plan_->parent(p);
    if (parent < 0) continue;
    children_[at(next[at(parent)]++)] = p;
    growth_[at(parent)] = std::max(growth_[at(parent)], growth_[at(p)]);
    least_floor_[at(parent)] = std::min(least_floor_[at(parent)], least_floor_[at(p)]);
  }
}

template <typename Scalar, int Lanes>
Scalar LargeEntries<Scalar, Lanes>::substituted(Index p) const {
  Scalar sum = 0;
  for (Index slot = plan_->column_begin[at(p)]; slot < plan_->diagonal_slot(p); ++slot)
    sum -= entry_[at(slot)] * x_[at(plan_->rows[at(slot)])];
  return sum;
}

template <typename Scalar, int Lanes>
void LargeEntries<Scalar, Lanes>::keep(Index p, Scalar x) {
  x_[at(p)] = x;
  size_[at(p)] = std::abs(x);
}

template <typename Scalar, int Lanes>
double LargeEntries<Scalar, Lanes>::largest_above(Index p) const {
  double largest = 0;
  for (Index slot = plan_->column_begin[at(p)]; slot < plan_->diagonal_slot(p); ++slot)
    largest = std::max(largest, size_[at(plan_->rows[at(slot)])]);
  return largest;
}

template <typename Scalar, int Lanes>
void LargeEntries<Scalar, Lanes>::column(Index j, double threshold,
                                         const std::function<void(Index k, Scalar z)>& visit) {
  const auto offer = [&](Index p) {
    if (size_[at(p)] > threshold * floor_[at(p)]) visit(plan_->row_of[at(p)], x_[at(p)]);
  };
  // The rows above a child are among its parent's and the parent itself.
  const auto open_children = [&](Index p, double above) {
    above = std::max(above, size_[at(p)]);
    for (Index c = child_begin_[at(p)]; c < child_begin_[at(p) + 1]; ++c) {
      const Index child = children_[at(c)];
      if (!on_path_[at(child)] && growth_[at(child)] * above > threshold * least_floor_[at(child)])
        stack_.push_back(child);
    }
  };
  path_.clear();
  for (Index p = plan_->position_of[at(j)]; p >= 0; p = plan_->parent(p)) {
    path_.push_back(p);
    x_[at(p)] = 0;
    on_path_[at(p)] = true;
  }
  x_[at(path_.front())] = 1;
  for (const Index p : path_)
    for (Index slot = plan_->column_begin[at(p)]; slot < plan_->diagonal_slot(p); ++slot)
      x_[at(plan_->rows[at(slot)])] -= entry_[at(slot)] * x_[at(p)];
  for (auto p = path_.rbegin(); p != path_.rend(); ++p) {
    keep(*p, substituted(*p) + entry_[at(plan_->diagonal_slot(*p))] * x_[at(*p)]);
    offer(*p);
    open_children(*p, largest_above(*p));
  }
  for (const Index p : path_) on_path_[at(p)] = false;
  while (!stack_.empty()) {
    const Index p = stack_.back();
    stack_.pop_back();
    const double above = largest_above(p);
    if (growth_[at(p)] * above <= threshold * least_floor_[at(p)]) continue;
    keep(p, substituted(p));
    offer(p);
    open_children(p, above);
  }
}

template class LargeEntries<std::complex<double>, 3>;

}  // namespace kiloamp::sparse
