#include "engine/sparse/task_partition.hpp"

#include <algorithm>
#include <cstddef>
#include <numeric>

namespace kiloamp::sparse {
namespace {

/// Share of the whole work in one task: fine enough for a balanced load on a few cores.
constexpr double kTaskShare = 1.0 / 32;
/// Work below this (multiply-adds; about 2 ms) is not worth starting threads for.
constexpr double kSerialWork = 4e5;
/// Fixed cost of a block in multiply-adds: loop starts, index reads, cache misses.
constexpr double kBlockCost = 12;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

double work_of(const Block& block) {
  if (block.updated < 0) return kBlockCost;
  const double size = block.updated + block.columns;
  return kBlockCost + size * size * (1.0 + block.columns) / 2;
}

}  // namespace

void number_in_postorder(std::vector<Block>& blocks) {
  std::vector<Index> size(blocks.size(), 0);
  Index all = 0;
  for (std::size_t b = 0; b < blocks.size(); ++b) {
    size[b] += blocks[b].columns;
    all += blocks[b].columns;
    if (blocks[b].parent >= 0) size[at(blocks[b].parent)] += size[b];
  }
  // From the last block to the first: a parent hands out the positions before its own, from the end.
  std::vector<Index> free_end(blocks.size());
  for (std::size_t b = blocks.size(); b-- > 0;) {
    Index& end = blocks[b].parent >= 0 ? free_end[at(blocks[b].parent)] : all;
    blocks[b].first = end - blocks[b].columns;
    free_end[b] = blocks[b].first;
    end -= size[b];
  }
}

std::vector<Index> partition_tasks(const std::vector<Block>& blocks, Index& tasks) {
  std::vector<Index> task_of(blocks.size(), -1);
  tasks = 0;
  std::vector<double> work(blocks.size(), 0);
  double all = 0;
  for (std::size_t b = 0; b < blocks.size(); ++b) {
    const double own = work_of(blocks[b]);
    all += own;
    work[b] += own;
    if (blocks[b].parent >= 0) work[at(blocks[b].parent)] += work[b];
  }
  if (all < kSerialWork) return task_of;
  const double limit = all * kTaskShare;
  std::vector<Index> roots;
  for (std::size_t b = 0; b < blocks.size(); ++b) {
    const bool parent_in_top = blocks[b].parent < 0 || work[at(blocks[b].parent)] > limit;
    if (work[b] <= limit && parent_in_top) roots.push_back(static_cast<Index>(b));
  }
  const auto by_position = [&](Index a, Index b) { return blocks[at(a)].first < blocks[at(b)].first; };
  std::sort(roots.begin(), roots.end(), by_position);
  double filled = limit;
  for (const Index root : roots) {
    if (filled + work[at(root)] > limit) {
      ++tasks;
      filled = 0;
    }
    filled += work[at(root)];
    task_of[at(root)] = tasks - 1;
  }
  for (std::size_t b = blocks.size(); b-- > 0;) {
    const Index parent = blocks[b].parent;
    if (task_of[b] < 0 && parent >= 0) task_of[b] = task_of[at(parent)];
  }
  return task_of;
}

}  // namespace kiloamp::sparse
