#include <algorithm>

#include "engine/sparse/front_matrix.hpp"
#include "engine/sparse/lane_factors.hpp"

namespace kiloamp::sparse {

template <int Width>
FrontLayout lay_out_fronts(const EliminationPlan& plan) {
  const auto triangle = [](Index rows) { return FrontMatrix<double, Width>::row_start(rows); };
  const auto at = [](Index i) { return static_cast<std::size_t>(i); };
  const auto owner = [&](const EliminationPlan::Front& front) {
    return at(front.task < 0 ? plan.tasks : front.task);
  };
  FrontLayout layout;
  layout.update_at.assign(plan.fronts.size(), 0);
  layout.inverse_at.assign(plan.fronts.size(), 0);
  layout.update_stack.assign(at(plan.tasks) + 1, 0);
  layout.inverse_stack.assign(at(plan.tasks) + 1, 0);
  std::vector<std::size_t> filled(at(plan.tasks) + 1, 0);
  for (const auto& step : plan.steps) {
    if (step.front < 0) continue;
    const auto& front = plan.fronts[at(step.front)];
    std::size_t& top = filled[owner(front)];
    for (Index k = plan.child_begin[at(step.front)]; k < plan.child_begin[at(step.front) + 1]; ++k) {
      const Index child = plan.children[at(k)];
      if (!is_detached(plan, child)) top -= triangle(plan.fronts[at(child)].rows);
    }
    std::size_t& target = is_detached(plan, step.front) ? layout.kept : top;
    layout.update_at[at(step.front)] = target;
    if (front.parent >= 0) target += triangle(front.rows);
    std::size_t& peak = layout.update_stack[owner(front)];
    peak = std::max(peak, top);
    layout.largest_front = std::max(layout.largest_front, triangle(front.rows + front.pivots));
  }
  for (std::size_t f = plan.fronts.size(); f-- > 0;) {
    const auto& front = plan.fronts[f];
    std::size_t place = 0;
    if (front.parent >= 0 && !is_detached(plan, static_cast<Index>(f))) {
      const auto& parent = plan.fronts[at(front.parent)];
      place = layout.inverse_at[at(front.parent)] + triangle(parent.rows + parent.pivots);
    }
    layout.inverse_at[f] = place;
    std::size_t& peak = layout.inverse_stack[owner(front)];
    peak = std::max(peak, place + triangle(front.rows + front.pivots));
  }
  return layout;
}

template FrontLayout lay_out_fronts<1>(const EliminationPlan&);
template FrontLayout lay_out_fronts<2>(const EliminationPlan&);
template FrontLayout lay_out_fronts<4>(const EliminationPlan&);

}  // namespace kiloamp::sparse
