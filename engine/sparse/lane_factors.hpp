// Storage of L and D of several lanes on one plan, and the quality marks left by elimination.
#pragma once
#include <algorithm>
#include <array>
#include <limits>
#include <memory>
#include <vector>

#include "engine/sparse/elimination_plan.hpp"
#include "engine/sparse/lane_pack.hpp"
#include "engine/sparse/line_array.hpp"

namespace kiloamp::sparse {

/// Memory places of fronts, in stripes; they follow from the plan and the stripe width.
struct FrontLayout {
  /// Update of a front: in its task's stack, or among the kept ones when its parent belongs to the top.
  std::vector<std::size_t> update_at;
  /// Inverse of a front in its task's stack: all fronts on the way to the root are alive together.
  std::vector<std::size_t> inverse_at;
  /// Per task, the top last.
  std::vector<std::size_t> update_stack;
  std::vector<std::size_t> inverse_stack;
  std::size_t kept = 0;
  std::size_t largest_front = 0;
};

/// True when front f hands its update from a task to the serial top.
[[nodiscard]] inline bool is_detached(const EliminationPlan& plan, Index f) {
  const auto& front = plan.fronts[static_cast<std::size_t>(f)];
  return front.parent >= 0 && plan.fronts[static_cast<std::size_t>(front.parent)].task != front.task;
}

template <int Width>
[[nodiscard]] FrontLayout lay_out_fronts(const EliminationPlan& plan);

/// A pivot that magnifies rounding by more than this has its own column probed (a sound network stays below).
inline constexpr double kSuspectGrowth = 1e5;

/// The worst pivots of a task in each lane.
///
/// The mark of a pivot d is max(|a|^2, |v|^2) / |d|^2 with a the diagonal entry it started from and v its
/// largest off-diagonal entry: the square of what elimination magnifies rounding by. About 1 for diagonally
/// dominant rows, infinite for a zero pivot.
template <int Lanes>
struct PivotWatch {
  static constexpr int kKept = 3;
  struct Mark {
    double squared = 0;
    Index step = -1;
  };
  std::array<std::array<Mark, kKept>, Lanes> worst{};
  std::array<double, Lanes> largest_squared{};  // largest |entry|^2 among pivot rows
  /// 0 while all marks are finite and no |v|^2 or |d|^2 exceeds kSuspectGrowth^2 |a|^2; else positive or NaN.
  std::array<double, Lanes> grown{};

  void offer(int lane, double squared, Index step) {
    auto& marks = worst[static_cast<std::size_t>(lane)];
    if (squared <= marks.back().squared) return;
    std::size_t place = kKept - 1;
    for (; place > 0 && squared > marks[place - 1].squared; --place) marks[place] = marks[place - 1];
    marks[place] = {squared, step};
  }
};

/// A = L D L^T, one slot per entry of the plan: L below the diagonal, 1 / D in the diagonal slots.
template <typename Scalar, int Width>
struct LaneFactors {
  std::shared_ptr<const EliminationPlan> plan;
  FrontLayout layout;
  LineArray<Pack<Scalar, Width>> slots;
  std::unique_ptr<Doubles<Width>[]> diagonal_squared;  // |a_pp|^2 by position
  std::vector<PivotWatch<Width>> watches;              // per task, the top last
  /// Largest |entry of A|^2 in each share of the input, as many as tasks but at least one; NaN where A is not
  /// finite.
  std::vector<std::array<double, Width>> largest_input_squared;

  explicit LaneFactors(std::shared_ptr<const EliminationPlan> shared_plan)
      : plan(std::move(shared_plan)),
        layout(lay_out_fronts<Width>(*plan)),
        slots(plan->all_slots()),
        diagonal_squared(
            std::make_unique_for_overwrite<Doubles<Width>[]>(static_cast<std::size_t>(plan->order))),
        watches(static_cast<std::size_t>(plan->tasks) + 1),
        largest_input_squared(std::max<std::size_t>(static_cast<std::size_t>(plan->tasks), 1)) {}
};

}  // namespace kiloamp::sparse
