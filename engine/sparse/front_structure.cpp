#include "engine/sparse/front_structure.hpp"

#include <cstddef>
#include <cstdint>

namespace kiloamp::sparse {
namespace {

/// Zeros a merge may add whatever the size of the front. Few: a front saved costs less than its zeros do in
/// all that reads the factors later, the backward passes above all.
constexpr std::int64_t kFreeZeros = 4;
/// Share of a merged front's pivot rows that may be explicit zeros.
constexpr double kZeroShare = 0.06;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

/// Buckets 0 .. keys - 1 of items by key, items in their own order inside a bucket.
void sort_by_key(const std::vector<Index>& key_of, Index keys, std::vector<Index>& begin,
                 std::vector<Index>& items) {
  begin.assign(at(keys) + 1, 0);
  for (const Index key : key_of) ++begin[at(key) + 1];
  for (std::size_t k = 0; k < at(keys); ++k) begin[k + 1] += begin[k];
  std::vector<Index> next(begin.begin(), begin.end() - 1);
  items.resize(key_of.size());
  for (std::size_t v = 0; v < key_of.size(); ++v) items[at(next[at(key_of[v])]++)] = static_cast<Index>(v);
}

/// Row structure without merging.
FrontStructure exact_structure(const PackedGraph& core, const FrontOrder& order) {
  FrontStructure result;
  sort_by_key(order.front_of, order.fronts, result.pivot_begin, result.pivots);
  result.front_of = order.front_of;
  result.parent.assign(at(order.fronts), -1);
  std::vector<Index> first_child(at(order.fronts), -1);
  std::vector<Index> next_sibling(at(order.fronts), -1);
  std::vector<Index> seen(at(core.order()), -1);
  for (Index f = 0; f < order.fronts; ++f) {
    Index parent = order.fronts;
    const auto add = [&](Index v) {
      const Index front = result.front_of[at(v)];
      if (front <= f || seen[at(v)] == f) return;
      seen[at(v)] = f;
      result.rows.push_back(v);
      if (front < parent) parent = front;
    };
    for (Index p = result.pivot_begin[at(f)]; p < result.pivot_begin[at(f) + 1]; ++p) {
      for (const Index other : core.neighbours(result.pivots[at(p)])) add(other);
    }
    for (Index c = first_child[at(f)]; c >= 0; c = next_sibling[at(c)]) {
      for (Index r = result.row_begin[at(c)]; r < result.row_begin[at(c) + 1]; ++r) add(result.rows[at(r)]);
    }
    result.row_begin.push_back(static_cast<Index>(result.rows.size()));
    if (parent == order.fronts) continue;
    result.parent[at(f)] = parent;
    next_sibling[at(f)] = first_child[at(parent)];
    first_child[at(parent)] = f;
  }
  return result;
}

/// into[f]: the front that f becomes part of (f itself where it stays).
std::vector<Index> choose_merges(const FrontStructure& exact) {
  const Index fronts = exact.fronts();
  std::vector<Index> into(at(fronts));
  std::vector<std::int64_t> pivots(at(fronts));
  std::vector<std::int64_t> zeros(at(fronts), 0);
  for (Index f = 0; f < fronts; ++f) pivots[at(f)] = exact.pivot_begin[at(f) + 1] - exact.pivot_begin[at(f)];
  for (Index f = 0; f < fronts; ++f) {
    into[at(f)] = f;
    const Index p = exact.parent[at(f)];
    if (p < 0) continue;
    const std::int64_t rows = exact.row_begin[at(f) + 1] - exact.row_begin[at(f)];
    const std::int64_t parent_rows = exact.row_begin[at(p) + 1] - exact.row_begin[at(p)];
    const std::int64_t added = pivots[at(f)] * (pivots[at(p)] + parent_rows - rows);
    const std::int64_t total = added + zeros[at(f)] + zeros[at(p)];
    const std::int64_t merged = pivots[at(f)] + pivots[at(p)];
    const double size =
        static_cast<double>(merged) * (static_cast<double>(merged) / 2 + static_cast<double>(parent_rows));
    if (total > kFreeZeros && static_cast<double>(total) > kZeroShare * size) continue;
    into[at(f)] = p;
    pivots[at(p)] = merged;
    zeros[at(p)] = total;
  }
  for (Index f = fronts - 1; f >= 0; --f) into[at(f)] = into[at(f)] == f ? f : into[at(into[at(f)])];
  return into;
}

}  // namespace

FrontStructure front_structure(const PackedGraph& core, const FrontOrder& order) {
  const FrontStructure exact = exact_structure(core, order);
  const std::vector<Index> into = choose_merges(exact);
  std::vector<Index> renumbered(into.size(), -1);
  FrontStructure result;
  for (Index f = 0; f < exact.fronts(); ++f) {
    if (into[at(f)] != f) continue;
    renumbered[at(f)] = result.fronts();
    result.parent.push_back(exact.parent[at(f)]);
    for (Index r = exact.row_begin[at(f)]; r < exact.row_begin[at(f) + 1]; ++r) {
      result.rows.push_back(exact.rows[at(r)]);
    }
    result.row_begin.push_back(static_cast<Index>(result.rows.size()));
  }
  for (Index& parent : result.parent) parent = parent < 0 ? -1 : renumbered[at(into[at(parent)])];
  // Pivots of a merged front keep the exact order, so that they are listed by the exact front they came from.
  std::vector<Index> merged_of(at(exact.fronts()));
  for (std::size_t f = 0; f < into.size(); ++f) merged_of[f] = renumbered[at(into[f])];
  std::vector<Index> front_by_rank(exact.pivots.size());
  for (std::size_t k = 0; k < exact.pivots.size(); ++k) {
    front_by_rank[k] = merged_of[at(exact.front_of[at(exact.pivots[k])])];
  }
  std::vector<Index> ranked;
  sort_by_key(front_by_rank, result.fronts(), result.pivot_begin, ranked);
  result.pivots.resize(ranked.size());
  result.rank.resize(ranked.size());
  result.front_of.resize(ranked.size());
  for (std::size_t k = 0; k < ranked.size(); ++k) {
    const Index v = exact.pivots[at(ranked[k])];
    result.pivots[k] = v;
    result.rank[at(v)] = static_cast<Index>(k);
    result.front_of[at(v)] = front_by_rank[at(ranked[k])];
  }
  return result;
}

}  // namespace kiloamp::sparse
