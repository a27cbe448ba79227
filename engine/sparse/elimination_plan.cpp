#include "engine/sparse/elimination_plan.hpp"

#include <algorithm>
#include <functional>
#include <limits>
#include <stdexcept>
#include <unordered_map>

#include "engine/sparse/front_structure.hpp"
#include "engine/sparse/task_partition.hpp"

namespace kiloamp::sparse {
namespace {

/// Narrow columns that are put in order of level together; their slots should stay in the cache.
constexpr Index kSortedTogether = 1024;
/// Narrow columns of a step at most: the worst pivot of each step is a suspect of its own.
constexpr Index kStepColumns = 16;

/// Columns and edges fetched in advance of their use, which jumps about in memory.
constexpr std::size_t kAhead = 32;

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
    list_steps();
    write_programs();
    locate_edges(edges);
    choose_spot(edges);
  }

  EliminationPlan take() { return std::move(plan_); }

 private:
  Index narrow() const { return static_cast<Index>(reduction_.sequence.size()); }

  /// Blocks of columns: the narrow columns in order of elimination, then the fronts.
  void form_blocks() {
    const Index narrow_count = narrow();
    blocks_.resize(at(narrow_count + core_.fronts()));
    const auto rank = [&](Index vertex) {
      return vertex < narrow_count ? vertex : narrow_count + core_.rank[at(vertex - narrow_count)];
    };
    for (Index b = 0; b < narrow_count; ++b) {
      Index parent = -1;  // the vertex, then the block eliminated first
      for (const Index other : reduction_.neighbours[at(b)]) {
        if (other >= 0 && (parent < 0 || rank(other) < rank(parent))) parent = other;
      }
      if (parent >= narrow_count) parent = narrow_count + core_.front_of[at(parent - narrow_count)];
      blocks_[at(b)] = {parent, 1, 0, -1};
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
    part_begin_.assign(2 * at(plan_.tasks) + 3, 0);
    for (Index b = 0; b < static_cast<Index>(blocks_.size()); ++b)
      part_begin_[part_of(b) + 1] += blocks_[at(b)].columns;
    for (std::size_t part = 1; part < part_begin_.size(); ++part) part_begin_[part] += part_begin_[part - 1];
    std::vector<Index> next = part_begin_;
    block_at_.assign(at(plan_.order), -1);
    for (const Index b : in_postorder) {
      if (b < 0) continue;
      Index& position = next[part_of(b)];
      blocks_[at(b)].first = position;
      block_at_[at(position)] = b;
      position += blocks_[at(b)].columns;
    }
    for (std::size_t part = 0; part + 1 < part_begin_.size(); part += 2) {
      for (Index from = part_begin_[part]; from < part_begin_[part + 1]; from += kSortedTogether) {
        const Index count = std::min(kSortedTogether, part_begin_[part + 1] - from);
        sort_by_level(std::span(block_at_).subspan(at(from), at(count)), from);
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
  void sort_by_level(std::span<Index> columns, Index first) {
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
    const std::vector<Index> unsorted(columns.begin(), columns.end());
    for (std::size_t k = 0; k < unsorted.size(); ++k) {
      const Index place = begin[at(key[k])]++;
      blocks_[at(unsorted[k])].first = first + place;
      columns[at(place)] = unsorted[k];
    }
  }

  /// Positions of vertices and rows.
  void number_rows() {
    position_of_.resize(at(plan_.order));
    plan_.position_of.resize(at(plan_.order));
    plan_.row_of.resize(at(plan_.order));
    const auto number = [&](Index vertex, Index row, Index position) {
      position_of_[at(vertex)] = position;
      plan_.position_of[at(row)] = position;
      plan_.row_of[at(position)] = row;
    };
    for (Index b = 0; b < narrow(); ++b) number(b, reduction_.sequence[at(b)], blocks_[at(b)].first);
    for (Index f = 0; f < core_.fronts(); ++f) {
      Index position = blocks_[at(narrow() + f)].first;
      for (Index p = core_.pivot_begin[at(f)]; p < core_.pivot_begin[at(f) + 1]; ++p) {
        const Index v = core_.pivots[at(p)];
        number(narrow() + v, reduction_.core[at(v)], position++);
      }
    }
  }

  /// column_begin and rows.
  void list_columns() {
    std::int64_t total = 0;
    for (Index b = 0; b < static_cast<Index>(blocks_.size()); ++b) {
      const std::int64_t columns = blocks_[at(b)].columns;
      const std::int64_t updated = b < narrow() ? narrow_entries(b) : blocks_[at(b)].updated;
      total += columns * updated + columns * (columns + 1) / 2;
    }
    if (total > std::numeric_limits<Index>::max())
      throw std::length_error("sparse factor exceeds 2^31 entries");
    plan_.column_begin.reserve(at(plan_.order) + 1);
    const auto fetch = [&](Index position) {
      if (at(position) + kAhead >= block_at_.size()) return;
      const Index later = block_at_[at(position) + kAhead];
      const Index soon = block_at_[at(position) + kAhead / 2];
      if (later >= 0 && later < narrow()) __builtin_prefetch(&reduction_.neighbours[at(later)]);
      if (soon < 0 || soon >= narrow()) return;
      for (const Index other : reduction_.neighbours[at(soon)]) {
        if (other >= 0) __builtin_prefetch(&position_of_[at(other)]);
      }
    };
    plan_.rows.resize(static_cast<std::size_t>(total));
    Index* to = plan_.rows.data();
    const auto end_column = [&] { plan_.column_begin.push_back(static_cast<Index>(to - plan_.rows.data())); };
    for (Index position = 0; position < plan_.order;
         position += blocks_[at(block_at_[at(position)])].columns) {
      const Index b = block_at_[at(position)];
      Index* const from = to;
      if (b < narrow()) {
        fetch(position);
        for (const Index other : reduction_.neighbours[at(b)]) {
          if (other < 0) continue;
          const Index row = position_of_[at(other)];
          Index* place = to++;
          for (; place > from && place[-1] < row; --place) *place = place[-1];
          *place = row;
        }
        *to++ = position;
        end_column();
        continue;
      }
      const Index f = b - narrow();
      for (Index r = core_.row_begin[at(f)]; r < core_.row_begin[at(f) + 1]; ++r)
        *to++ = position_of_[at(narrow() + core_.rows[at(r)])];
      std::sort(from, to, std::greater<>());
      for (Index p = blocks_[at(b)].columns; p-- > 0;) *to++ = position + p;
      end_column();
      // The next columns have one row less each.
      for (Index length = static_cast<Index>(to - from) - 1; length > blocks_[at(b)].updated; --length) {
        to = std::copy_n(from, length, to);
        end_column();
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

  /// Steps of the tasks, the top last: a few narrow columns each, then the fronts.
  void list_steps() {
    plan_.task_step_begin.push_back(0);
    for (Index task = 0; task <= plan_.tasks; ++task) {
      const Index fronts = part_begin_[2 * at(task) + 1];
      const Index end = part_begin_[2 * at(task) + 2];
      for (Index position = part_begin_[2 * at(task)]; position < fronts; position += kStepColumns)
        plan_.steps.push_back({position, std::min(kStepColumns, fronts - position), -1, 0, 0});
      for (Index position = fronts; position < end; position += plan_.steps.back().columns) {
        const Index b = block_at_[at(position)];
        plan_.fronts[at(b - narrow())].task = task < plan_.tasks ? task : -1;
        plan_.steps.push_back({position, blocks_[at(b)].columns, b - narrow(), 0, 0});
      }
      plan_.task_step_begin.push_back(static_cast<Index>(plan_.steps.size()));
    }
  }

  /// `targets` of the narrow columns, with the overflow slots of tasks.
  void write_programs() {
    Index task_end = 0;  // position behind the task's columns
    std::unordered_map<Index, Index> overflow_of;
    for (Index task = 0; task <= plan_.tasks; ++task) {
      for (const Index s : plan_.steps_of(task)) task_end += plan_.steps[at(s)].columns;
      overflow_of.clear();
      const auto target = [&](Index column, Index slot) {
        if (column < task_end) return slot;
        const Index next = plan_.slots() + static_cast<Index>(plan_.overflow_target.size());
        const auto [known, is_new] = overflow_of.try_emplace(slot, next);
        if (is_new) plan_.overflow_target.push_back(slot);
        return known->second;
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
    plan_.edge_column.resize(edges.size());
    plan_.edge_slot.resize(edges.size());
    std::vector<bool> filled(at(plan_.slots()), true);
    const auto fetch = [&](std::size_t e) {
      if (e + kAhead >= edges.size()) return;
      const Edge& later = edges[e + kAhead];
      __builtin_prefetch(&plan_.position_of[at(later.i)]);
      __builtin_prefetch(&plan_.position_of[at(later.j)]);
      const Edge& soon = edges[e + kAhead / 2];
      const Index column = std::min(plan_.position_of[at(soon.i)], plan_.position_of[at(soon.j)]);
      __builtin_prefetch(&plan_.column_begin[at(column)]);
    };
    for (std::size_t e = 0; e < edges.size(); ++e) {
      fetch(e);
      const auto [a, b] = std::minmax(plan_.position_of[at(edges[e].i)], plan_.position_of[at(edges[e].j)]);
      plan_.edge_column[e] = a;
      plan_.edge_slot[e] = plan_.find_slot(a, b);
      filled[at(plan_.edge_slot[e])] = false;
    }
    plan_.row_slot.resize(at(plan_.order));
    for (Index row = 0; row < plan_.order; ++row)
      plan_.row_slot[at(row)] = plan_.diagonal_slot(plan_.position_of[at(row)]);
    plan_.fill_slots.reserve(at(plan_.slots() - plan_.order) - edges.size());
    for (Index p = 0; p < plan_.order; ++p) {
      for (Index slot = plan_.column_begin[at(p)]; slot < plan_.diagonal_slot(p); ++slot) {
        if (filled[at(slot)]) plan_.fill_slots.push_back(slot);
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
    std::vector<bool> on_path(at(plan_.order), false);  // by row: small, so that the many misses are cheap
    for (const Index p : spot.path) on_path[at(plan_.row_of[at(p)])] = true;
    for (std::size_t e = 0; e < edges.size(); ++e) {
      if (!on_path[at(edges[e].i)] && !on_path[at(edges[e].j)]) continue;
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
  std::vector<Index> part_begin_;   // position of the narrow columns of a task, of its fronts, of the next ..
  std::vector<Index> block_at_;     // first position -> block
  std::vector<Index> position_of_;  // vertex -> position
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
