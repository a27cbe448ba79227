#include "engine/sparse/analysis.hpp"

#include <algorithm>
#include <cassert>

#include "engine/sparse/elimination_plan.hpp"

namespace kiloamp::sparse {

Analysis::Analysis(Index order, std::span<const Edge> edges) : edges_(edges.begin(), edges.end()) {
  assert(order >= 0);
  assert(std::ranges::all_of(edges_, [order](const Edge& edge) {
    return edge.i != edge.j && std::min(edge.i, edge.j) >= 0 && std::max(edge.i, edge.j) < order;
  }));
  plan_ = std::make_shared<const EliminationPlan>(plan_elimination(order, edges_));
}

Analysis::~Analysis() = default;

Index Analysis::order() const { return plan_->order; }

std::span<const Edge> Analysis::edges() const { return edges_; }

std::size_t Analysis::factor_entries() const { return static_cast<std::size_t>(plan_->slots()); }

Index Analysis::tree_height() const {
  std::vector<Index> depth(static_cast<std::size_t>(plan_->order));
  Index height = 0;
  for (Index p = plan_->order; p-- > 0;) {
    const Index parent = plan_->parent(p);
    depth[static_cast<std::size_t>(p)] = parent < 0 ? 1 : depth[static_cast<std::size_t>(parent)] + 1;
    height = std::max(height, depth[static_cast<std::size_t>(p)]);
  }
  return height;
}

}  // namespace kiloamp::sparse
