#include "engine/sparse/elimination_plan.hpp"

#include <algorithm>
#include <functional>
#include <limits>
#include <stdexcept>

#include "engine/sparse/front_structure.hpp"
#include "engine/sparse/task_partition.hpp"

namespace kiloamp::sparse {
namespace {

/// Narrow columns that are put in order of level together; their slots should stay in the cache.
constexpr Index kSortedTogether = 1024;
/// Narrow columns of a step at most: the worst pivot of each step is a suspect of its own.
constexpr Index kStepColumns = 16;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

class Planner {
 public:
  Planner(Index order, std::span<const Edge> edges) : reduction_(reduce_graph(order, edges)) {
    plan_.order = order;
    plan_.edges = edges.size();
    const PackedGraph& core = reduction_.core_graph;
    core_ = front_structure(core, minimum_degree_order(core));
    form_blocks();
    number_in_postorder(blocks_);
    const std::vector<Index> task_of = partition_tasks(blocks_, plan_.tasks);
    place_blocks(task_of);
    number_rows();
    list_columns();
    connect_fronts();
    list_steps(task_of);
    write_programs(task_of);
    locate_edges(edges);
    choose_spot(edges);
  }

  EliminationPlan take() { return std::move(plan_); }

 private:
  Index narrow() const { return static_cast<Index>(reduction_.sequence.size()); }

  /// Blocks of columns: the narrow columns in order of elimination, then the fronts.
  void form_blocks() {
    const Index narrow_count = narrow();
    std::vector<Index> block_of(at(plan_.order));  // of a row; for core rows: narrow + front
    std::vector<Index> rank(at(plan_.order));
    for (Index b = 0; b < narrow_count; ++b) {
      block_of[at(reduction_.sequence[at(b)])] = b;
      rank[at(reduction_.sequence[at(b)])] = b;
    }
    for (std::size_t v = 0; v < reduction_.core.size(); ++v) {
      block_of[at(reduction_.core[v])] = narrow_count + core_.front_of[v];
      rank[at(reduction_.core[v])] = narrow_count + core_.rank[v];
    }
    blocks_.resize(at(narrow_count + core_.fronts()));
    for (Index b = 0; b < narrow_count; ++b) {
      Index first = -1;
      for (const Index other : reduction_.neighbours[at(b)]) {
        if (other >= 0 && (first < 0 || rank[at(other)] < rank[at(first)])) first = other;
      }
      blocks_[at(b)] = {first < 0 ? -1 : block_of[at(first)], 1, 0, -1};
    }
    for (Index f = 0; f < core_.fronts(); ++f) {
      const Index parent = core_.parent[at(f)];
      const Index pivots = core_.pivot_begin[at(f) + 1] - core_.pivot_begin[at(f)];
      const Index updated = core_.row_begin[at(f) + 1] - core_.row_begin[at(f)];
      blocks_[at(narrow_count + f)] = {parent < 0 ? -1 : narrow_count + parent, pivots, 0, updated};
    }
  }

  /// Moves the blocks from postorder to their final positions: task by task, the top last, in each the narrow
  /// columns first.
  void place_blocks(const std::vector<Index>& task_of) {
    std::vector<Index> in_postorder(at(plan_.order), -1);
    for (std::size_t b = 0; b < blocks_.size(); ++b)
      in_postorder[at(blocks_[b].first)] = static_cast<Index>(b);
    const auto part_of = [&](Index b) {
      const Index task = task_of[at(b)] < 0 ? plan_.tasks : task_of[at(b)];
      return 2 * at(task) + (b < narrow() ? 0 : 1);
    };
    std::vector<Index> begin(2 * at(plan_.tasks) + 3, 0);
    for (Index b = 0; b < static_cast<Index>(blocks_.size()); ++b)
      begin[part_of(b) + 1] += blocks_[at(b)].columns;
    for (std::size_t part = 1; part < begin.size(); ++part) begin[part] += begin[part - 1];
    std::vector<Index> next = begin;
    std::vector<Index> narrow_at(at(plan_.order));
    for (const Index b : in_postorder) {
      if (b < 0) continue;
      Index& position = next[part_of(b)];
      blocks_[at(b)].first = position;
      if (b < narrow()) narrow_at[at(position)] = b;
      position += blocks_[at(b)].columns;
    }
    for (std::size_t part = 0; part + 1 < begin.size(); part += 2) {
      for (Index from = begin[part]; from < begin[part + 1]; from += kSortedTogether) {
        const Index count = std::min(kSortedTogether, begin[part + 1] - from);
        sort_by_level(std::span(narrow_at).subspan(at(from), at(count)), from);
      }
    }
  }

  Index narrow_entries(Index b) const {
    Index entries = 0;
    for (const Index other : reduction_.neighbours[at(b)]) entries += other >= 0 ? 1 : 0;
    return entries;
  }

  /// Orders narrow columns, the first at position `first`, by their height in the tree among themselves, then
  /// by length. A column then seldom waits for the one before it, and its length is easily guessed.
  void sort_by_level(std::span<const Index> columns, Index first) {
    constexpr Index kLengths = kLargestReducedDegree + 1;
    const auto end = first + static_cast<Index>(columns.size());
    std::vector<Index> key(columns.size(), 0);
    for (std::size_t k = 0; k < columns.size(); ++k) {
      const Index parent = blocks_[at(columns[k])].parent;
      if (parent >= 0 && parent < narrow() && blocks_[at(parent)].first < end) {
        Index& level = key[at(blocks_[at(parent)].first - first)];
        level = std::max(level, key[k] + 1);
      }
    }
    std::vector<Index> begin(at(kLengths) * columns.size() + 1, 0);
    for (std::size_t k = 0; k < columns.size(); ++k) {
      key[k] = kLengths * key[k] + narrow_entries(columns[k]);
      ++begin[at(key[k]) + 1];
    }
    for (std::size_t k = 1; k < begin.size(); ++k) begin[k] += begin[k - 1];
    for (std::size_t k = 0; k < columns.size(); ++k)
      blocks_[at(columns[k])].first = first + begin[at(key[k])]++;
  }

  void number_rows() {
    plan_.position_of.resize(at(plan_.order));
    plan_.row_of.resize(at(plan_.order));
    const auto number = [&](Index row, Index position) {
      plan_.position_of[at(row)] = position;
      plan_.row_of[at(position)] = row;
    };
    for (Index b = 0; b < narrow(); ++b) number(reduction_.sequence[at(b)], blocks_[at(b)].first);
    for (Index f = 0; f < core_.fronts(); ++f) {
      Index position = blocks_[at(narrow() + f)].first;
      for (Index p = core_.pivot_begin[at(f)]; p < core_.pivot_begin[at(f) + 1]; ++p) {
        number(reduction_.core[at(core_.pivots[at(p)])], position++);
      }
    }
  }

  /// column_begin and rows.
  void list_columns() {
    const Index narrow_count = narrow();
    std::vector<std::int64_t> length(at(plan_.order));
    std::int64_t total = 0;
    for (Index b = 0; b < narrow_count; ++b) {
      length[at(blocks_[at(b)].first)] = narrow_entries(b) + 1;
    }
    for (std::size_t b = at(narrow_count); b < blocks_.size(); ++b) {
      for (Index p = 0; p < blocks_[b].columns; ++p) {
        length[at(blocks_[b].first + p)] = blocks_[b].updated + blocks_[b].columns - p;
      }
    }
    plan_.column_begin.reserve(length.size() + 1);
    for (const std::int64_t entries : length) {
      total += entries;
      if (total > std::numeric_limits<Index>::max())
        throw std::length_error("sparse factor exceeds 2^31 entries");
      plan_.column_begin.push_back(static_cast<Index>(total));
    }
    plan_.rows.resize(at(plan_.slots()));
    for (Index b = 0; b < narrow_count; ++b) {
      const Index position = blocks_[at(b)].first;
      const Index from = plan_.column_begin[at(position)];
      Index to = from;
      for (const Index other : reduction_.neighbours[at(b)]) {
        if (other < 0) continue;
        Index slot = to++;
        const Index place = plan_.position_of[at(other)];
        for (; slot > from && plan_.rows[at(slot) - 1] < place; --slot)
          plan_.rows[at(slot)] = plan_.rows[at(slot) - 1];
        plan_.rows[at(slot)] = place;
      }
      plan_.rows[at(to)] = position;
    }
    std::vector<Index> falling;
    for (Index f = 0; f < core_.fronts(); ++f) {
      falling.clear();
      for (Index r = core_.row_begin[at(f)]; r < core_.row_begin[at(f) + 1]; ++r) {
        falling.push_back(plan_.position_of[at(reduction_.core[at(core_.rows[at(r)])])]);
      }
      std::sort(falling.begin(), falling.end(), std::greater<>());
      const auto& block = blocks_[at(narrow_count + f)];
      for (Index p = block.columns - 1; p >= 0; --p) {
        falling.push_back(block.first + p);
        std::copy(falling.begin(), falling.end(),
                  plan_.rows.begin() + plan_.column_begin[at(block.first + p)]);
      }
    }
  }

  /// Front records, children, and where each front's rows lie in its parent.
  void connect_fronts() {
    const Index narrow_count = narrow();
    const Index count = core_.fronts();
    plan_.child_begin.assign(at(count) + 1, 0);
    std::vector<Index> place(at(plan_.order), -1);
    for (Index f = 0; f < count; ++f) {
      const auto& block = blocks_[at(narrow_count + f)];
      plan_.fronts.push_back({block.first, block.columns, block.updated, core_.parent[at(f)], 0, -1});
      if (core_.parent[at(f)] >= 0) ++plan_.child_begin[at(core_.parent[at(f)]) + 1];
    }
    for (std::size_t f = 0; f < at(count); ++f) plan_.child_begin[f + 1] += plan_.child_begin[f];
    plan_.children.resize(at(plan_.child_begin.back()));
    std::vector<Index> next(plan_.child_begin.begin(), plan_.child_begin.end() - 1);
    for (Index f = 0; f < count; ++f) {
      if (core_.parent[at(f)] >= 0) plan_.children[at(next[at(core_.parent[at(f)])]++)] = f;
    }
    for (Index f = 0; f < count; ++f) {
      const auto& front = plan_.fronts[at(f)];
      const Index size = front.rows + front.pivots;
      const Index* const falling = plan_.rows.data() + plan_.column_begin[at(front.first)];
      for (Index r = 0; r < size && plan_.child_begin[at(f)] < plan_.child_begin[at(f) + 1]; ++r)
        place[at(falling[r])] = r;
      for (Index k = plan_.child_begin[at(f)]; k < plan_.child_begin[at(f) + 1]; ++k) {
        auto& child = plan_.fronts[at(plan_.children[at(k)])];
        child.map_begin = static_cast<Index>(plan_.row_map.size());
        const Index* const child_rows = plan_.rows.data() + plan_.column_begin[at(child.first)];
        for (Index r = 0; r < child.rows; ++r) plan_.row_map.push_back(place[at(child_rows[r])]);
      }
    }
  }

  /// Steps in order of position, a new one at each front and at each change of task.
  void list_steps(const std::vector<Index>& task_of) {
    const Index narrow_count = narrow();
    std::vector<Index> block_at(at(plan_.order), -1);
    for (std::size_t b = 0; b < blocks_.size(); ++b) block_at[at(blocks_[b].first)] = static_cast<Index>(b);
    std::vector<Index> owner;
    for (Index position = 0; position < plan_.order;) {
      const Index b = block_at[at(position)];
      const Index front = b < narrow_count ? -1 : b - narrow_count;
      if (front >= 0) plan_.fronts[at(front)].task = task_of[at(b)];
      if (front < 0 && !plan_.steps.empty() && plan_.steps.back().front < 0 &&
          owner.back() == task_of[at(b)] && plan_.steps.back().columns < kStepColumns) {
        ++plan_.steps.back().columns;
      } else {
        plan_.steps.push_back({position, blocks_[at(b)].columns, front, 0, 0});
        owner.push_back(task_of[at(b)]);
      }
      position += blocks_[at(b)].columns;
    }
    for (Index& task : owner) task = task < 0 ? plan_.tasks : task;
    plan_.task_step_begin.assign(at(plan_.tasks) + 2, 0);
    for (const Index task : owner) ++plan_.task_step_begin[at(task) + 1];
    for (std::size_t t = 0; t <= at(plan_.tasks); ++t)
      plan_.task_step_begin[t + 1] += plan_.task_step_begin[t];
    std::vector<Index> next(plan_.task_step_begin.begin(), plan_.task_step_begin.end() - 1);
    plan_.task_steps.resize(owner.size());
    for (std::size_t s = 0; s < owner.size(); ++s) {
      plan_.task_steps[at(next[at(owner[s])]++)] = static_cast<Index>(s);
    }
  }

  /// `targets` of the narrow columns, with the overflow slots of tasks.
  void write_programs(const std::vector<Index>& task_of) {
    std::vector<Index> task_at;
    std::vector<Index> overflow_of;
    if (plan_.tasks > 0) {
      task_at.resize(at(plan_.order));
      overflow_of.assign(at(plan_.slots()), -1);
      for (std::size_t b = 0; b < blocks_.size(); ++b) {
        for (Index p = 0; p < blocks_[b].columns; ++p) task_at[at(blocks_[b].first + p)] = task_of[b];
      }
    }
    for (Index task = 0; task <= plan_.tasks; ++task) {
      const Index overflow_first = static_cast<Index>(plan_.overflow_target.size());
      const auto target = [&](Index column, Index slot) {
        if (task == plan_.tasks || task_at[at(column)] == task) return slot;
        Index& overflow = overflow_of[at(slot)];
        if (overflow < overflow_first) {
          overflow = static_cast<Index>(plan_.overflow_target.size());
          plan_.overflow_target.push_back(slot);
        }
        return plan_.slots() + overflow;
      };
      for (const Index s : plan_.steps_of(task)) {
        auto& step = plan_.steps[at(s)];
        step.target_begin = static_cast<Index>(plan_.targets.size());
        if (step.front >= 0) continue;
        for (Index p = step.first; p < step.first + step.columns; ++p) {
          const Index from = plan_.column_begin[at(p)];
          for (Index x = from; x < plan_.diagonal_slot(p); ++x) {
            const Index column = plan_.rows[at(x)];
            for (Index y = from; y < x; ++y) {
              plan_.targets.push_back(target(column, plan_.find_slot(column, plan_.rows[at(y)])));
            }
            plan_.targets.push_back(target(column, plan_.diagonal_slot(column)));
          }
        }
        step.targets = static_cast<Index>(plan_.targets.size()) - step.target_begin;
      }
      if (task < plan_.tasks)
        plan_.overflow_begin.push_back(static_cast<Index>(plan_.overflow_target.size()));
    }
  }

  void locate_edges(std::span<const Edge> edges) {
    plan_.source.assign(at(plan_.slots()), -1);
    plan_.edge_slot.resize(edges.size());
    for (std::size_t e = 0; e < edges.size(); ++e) {
      const auto [a, b] = std::minmax(plan_.position_of[at(edges[e].i)], plan_.position_of[at(edges[e].j)]);
      plan_.edge_slot[e] = plan_.find_slot(a, b);
      plan_.source[at(plan_.edge_slot[e])] = static_cast<Index>(e);
    }
    plan_.row_slot.resize(at(plan_.order));
    for (Index row = 0; row < plan_.order; ++row) {
      const Index slot = plan_.diagonal_slot(plan_.position_of[at(row)]);
      plan_.row_slot[at(row)] = slot;
    }
    plan_.fill_slots.reserve(at(plan_.slots() - plan_.order) - edges.size());
    for (Index p = 0; p < plan_.order; ++p) {
      for (Index slot = plan_.column_begin[at(p)]; slot < plan_.diagonal_slot(p); ++slot) {
        if (plan_.source[at(slot)] < 0) plan_.fill_slots.push_back(slot);
      }
    }
  }

  /// The last column and one from the middle: a root, where all rounding arrives, and an ordinary row.
  void choose_spot(std::span<const Edge> edges) {
    auto& spot = plan_.spot;
    std::vector<Index> place(at(plan_.order), -1);
    const auto add_column = [&](Index position) {
      if (place[at(position)] >= 0) return;
      spot.columns.push_back(plan_.row_of[at(position)]);
      for (Index p = position; p >= 0 && place[at(p)] < 0; p = plan_.parent(p)) {
        place[at(p)] = static_cast<Index>(spot.path.size());
        spot.path.push_back(p);
        spot.unknowns.push_back(plan_.row_of[at(p)]);
      }
    };
    if (plan_.order > 0) {
      add_column(plan_.order - 1);
      add_column(plan_.order / 2);
    }
    for (std::size_t e = 0; e < edges.size(); ++e) {
      const auto add = [&](Index equation, Index unknown) {
        const Index p = plan_.position_of[at(equation)];
        if (place[at(p)] < 0) return;
        spot.terms.push_back({place[at(p)], plan_.position_of[at(unknown)], static_cast<Index>(e)});
        spot.unknowns.push_back(unknown);
      };
      add(edges[e].i, edges[e].j);
      add(edges[e].j, edges[e].i);
    }
  }

  Reduction reduction_;
  FrontStructure core_;
  std::vector<Block> blocks_;
  EliminationPlan plan_;
};

}  // namespace

Index EliminationPlan::find_slot(Index a, Index b) const {
  const auto from = rows.begin() + column_begin[static_cast<std::size_t>(a)];
  const auto to = rows.begin() + column_begin[static_cast<std::size_t>(a) + 1];
  auto found = from;
  if (to - from <= kLargestReducedDegree + 1) {
    while (*found != b) ++found;
  } else {
    found = std::lower_bound(from, to, b, std::greater<>());
  }
  return static_cast<Index>(found - rows.begin());
}

EliminationPlan plan_elimination(Index order, std::span<const Edge> edges) {
  return Planner(order, edges).take();
}

}  // namespace kiloamp::sparse
