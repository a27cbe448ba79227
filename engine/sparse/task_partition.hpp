// Tree of column blocks: its postorder and its division into independent tasks.
#pragma once
#include <vector>

#include "engine/sparse/pattern.hpp"

namespace kiloamp::sparse {

/// Consecutive columns eliminated together. Blocks are listed children before parents.
struct Block {
  Index parent;   // block that contains the first row updated, -1: root
  Index columns;  // columns in the block
  Index first;    // position of the first column, set by number_in_postorder
  Index updated;  // rows of the update of a front, -1: one narrow column
};

/// Sets `first` so that each block follows its subtree and subtrees are contiguous. No recursion.
void number_in_postorder(std::vector<Block>& blocks);

/// task_of[block]: 0 .. tasks - 1 for blocks in tasks, -1 for the top that is done serially afterwards.
///
/// A task is a run of whole subtrees holding about kTaskShare of the work. Patterns below kSerialWork get no
/// task. Depends on the blocks alone, never on the machine.
[[nodiscard]] std::vector<Index> partition_tasks(const std::vector<Block>& blocks, Index& tasks);

}  // namespace kiloamp::sparse
