// Everything that elimination needs to know about a pattern: order, places of L, programs, fronts, tasks.
#pragma once
#include <cstddef>
#include <ranges>
#include <span>
#include <vector>

#include "engine/sparse/pattern.hpp"

namespace kiloamp::sparse {

/// One elimination plan. "Position" p counts rows in elimination order; "slot" counts the stored entries.
///
/// Column p of L occupies slots column_begin[p] .. column_begin[p + 1] - 1; rows[slot] is the position of the
/// entry's row, falling, so that the last slot of a column is its diagonal (the pivot) and the one before it
/// is the parent of p in the elimination tree.
///
/// Rows that the graph reduction eliminated ("narrow" columns, at most 3 off-diagonal entries) are updated by
/// a flat program: for column p with entries a, b, c, `targets` lists the slots of the places (a,a) (a,b)
/// (b,b) (a,c) (b,c) (c,c), as many as there are. All other columns belong to fronts: dense lower triangles
/// whose rows fall in position, pivots last.
///
/// The positions of a task follow one another, narrow columns first. Those stand level by level: columns that
/// do not wait for each other, and of equal length, side by side.
///
/// Tasks are disjoint unions of subtrees; what they update outside themselves goes to their own overflow
/// slots (numbered after the ordinary ones) and is added to overflow_target[] afterwards, task by task. The
/// partition depends on the pattern alone, so results do not depend on the number of threads.
struct EliminationPlan {
  struct Step {
    Index first;         // position of the first column
    Index columns;       // consecutive columns, few where they are narrow
    Index front;         // the front they form, -1: narrow columns
    Index target_begin;  // narrow: where their program starts in `targets`
    Index targets;       // narrow: its length
  };
  struct Front {
    Index first;      // position of the first pivot
    Index pivots;     // columns it eliminates
    Index rows;       // rows it updates
    Index parent;     // front that receives the update, -1: none
    Index map_begin;  // row_map[map_begin + r]: row r of this front in the parent
    Index task;       // -1: the serial top
  };

  Index order = 0;
  std::size_t edges = 0;
  std::vector<Index> position_of;  // row -> position
  std::vector<Index> row_of;       // position -> row
  std::vector<Index> column_begin{0};
  std::vector<Index> rows;
  std::vector<Index> edge_column;  // edge -> position of the column that holds it
  std::vector<Index> edge_slot;    // edge -> slot
  std::vector<Index> row_slot;     // row -> slot of its diagonal
  std::vector<Index> fill_slots;   // slots where A has no entry, rising

  std::vector<Step> steps;
  std::vector<Index> targets;
  std::vector<Front> fronts;
  std::vector<Index> row_map;
  std::vector<Index> child_begin{0};  // children of front f: children[child_begin[f]] ..
  std::vector<Index> children;

  /// steps_of(t): ids of the steps of task t in elimination order; t = tasks is the serial top.
  Index tasks = 0;
  std::vector<Index> task_step_begin;
  std::vector<Index> overflow_begin{0};  // per task
  std::vector<Index> overflow_target;

  /// The equations by which every factorisation is checked: those of all rows on the tree paths of two
  /// columns of the inverse.
  struct Spot {
    struct Term {
      Index place;     // the equation, counted along `path`
      Index position;  // the unknown
      Index edge;      // its coefficient
    };
    std::vector<Index> columns;   // rows
    std::vector<Index> path;      // positions on the tree paths of `columns`
    std::vector<Term> terms;      // off-diagonal ones
    std::vector<Index> unknowns;  // rows
  };
  Spot spot;

  [[nodiscard]] Index slots() const { return column_begin.back(); }
  [[nodiscard]] std::size_t all_slots() const {
    return static_cast<std::size_t>(slots()) + overflow_target.size();
  }
  [[nodiscard]] Index diagonal_slot(Index position) const {
    return column_begin[static_cast<std::size_t>(position) + 1] - 1;
  }
  /// Parent in the elimination tree, -1 for a root.
  [[nodiscard]] Index parent(Index position) const {
    const Index last = diagonal_slot(position);
    return last == column_begin[static_cast<std::size_t>(position)]
               ? -1
               : rows[static_cast<std::size_t>(last) - 1];
  }
  /// Slot of the place (a, b), a < b, which must be in the structure of L.
  [[nodiscard]] Index find_slot(Index a, Index b) const;
  [[nodiscard]] auto steps_of(Index task) const {
    return std::views::iota(task_step_begin[static_cast<std::size_t>(task)],
                            task_step_begin[static_cast<std::size_t>(task) + 1]);
  }
};

/// Orders and analyses a pattern. Any graph: empty, islands, isolated rows, stars, chains, cliques.
[[nodiscard]] EliminationPlan plan_elimination(Index order, std::span<const Edge> edges);

}  // namespace kiloamp::sparse
