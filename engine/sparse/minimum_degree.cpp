#include "engine/sparse/minimum_degree.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>

namespace kiloamp::sparse {
namespace {

/// A vertex with more than max(kDenseFloor, kDenseFactor * sqrt(n)) neighbours is ordered last.
constexpr double kDenseFactor = 10;
constexpr double kDenseFloor = 40;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

class QuotientGraph {
 public:
  explicit QuotientGraph(const PackedGraph& graph)
      : list_(graph.adjacency),
        begin_(graph.begin),
        length_(at(graph.order()), 0),
        cliques_(at(graph.order()), 0),
        weight_(at(graph.order()), 1),
        degree_(at(graph.order()), 0),
        merged_into_(at(graph.order()), -1),
        front_(at(graph.order()), -1),
        head_(at(graph.order()) + 1, -1),
        next_(at(graph.order()), -1),
        previous_(at(graph.order()), -1),
        hash_head_(at(graph.order()), -1),
        hash_next_(at(graph.order()), -1),
        hash_(at(graph.order()), 0),
        outside_(at(graph.order()), 0),
        mark_(at(graph.order()), 0),
        dead_clique_(at(graph.order()), 0),
        clique_(at(graph.order()), Clique{}),
        left_(graph.order()) {}

  FrontOrder run() {
    const auto order = static_cast<Index>(weight_.size());
    set_dense_aside(order);
    for (Index v = 0; v < order; ++v) {
      if (weight_[at(v)] == 0) continue;
      for (Index k = 0; k < length_[at(v)]; ++k) degree_[at(v)] += weight_[at(entry(v, k))];
      file(v);
    }
    while (left_ > 0) eliminate(take_lowest());
    FrontOrder result;
    for (const Index v : dense_) front_[at(v)] = fronts_++;
    result.front_of.assign(weight_.size(), -1);
    for (Index v = 0; v < order; ++v) {
      Index root = v;
      while (front_[at(root)] < 0) root = merged_into_[at(root)];
      for (Index step = v; front_[at(step)] < 0; step = merged_into_[at(step)])
        front_[at(step)] = front_[at(root)];
      result.front_of[at(v)] = front_[at(root)];
    }
    result.fronts = fronts_;
    return result;
  }

 private:
  struct Clique {
    std::size_t begin = 0;
    Index length = 0;
    Index weight = 0;
  };

  Index& entry(Index v, Index k) { return list_[at(begin_[at(v)] + k)]; }

  void set_dense_aside(Index order) {
    const double limit = std::max(kDenseFloor, kDenseFactor * std::sqrt(static_cast<double>(order)));
    for (Index v = 0; v < order; ++v) {
      length_[at(v)] = begin_[at(v) + 1] - begin_[at(v)];
      if (length_[at(v)] <= limit) continue;
      dense_.push_back(v);
      weight_[at(v)] = 0;
      --left_;
    }
  }

  void file(Index v) {
    const std::size_t d = at(degree_[at(v)]);
    next_[at(v)] = head_[d];
    previous_[at(v)] = -1;
    if (head_[d] >= 0) previous_[at(head_[d])] = v;
    head_[d] = v;
    lowest_ = std::min(lowest_, d);
  }

  void unfile(Index v) {
    const Index after = next_[at(v)];
    const Index before = previous_[at(v)];
    if (after >= 0) previous_[at(after)] = before;
    if (before >= 0) {
      next_[at(before)] = after;
    } else {
      head_[at(degree_[at(v)])] = after;
    }
  }

  Index take_lowest() {
    while (head_[lowest_] < 0) ++lowest_;
    const Index pivot = head_[lowest_];
    unfile(pivot);
    return pivot;
  }

  void eliminate(Index pivot) {
    front_[at(pivot)] = fronts_++;
    left_ -= weight_[at(pivot)];
    weight_[at(pivot)] = 0;
    form_clique(pivot);
    measure_cliques_outside(pivot);
    update_members(pivot);
    merge_indistinguishable(pivot);
    file_members(pivot);
  }

  void join(Index v, Clique& clique) {
    if (weight_[at(v)] <= 0) return;  // eliminated, merged, or a member already
    clique.weight += weight_[at(v)];
    weight_[at(v)] = -weight_[at(v)];
    unfile(v);
    pool_.push_back(v);
  }

  void form_clique(Index pivot) {
    Clique fresh{pool_.size(), 0, 0};
    for (Index k = 0; k < length_[at(pivot)]; ++k) {
      const Index other = entry(pivot, k);
      if (k >= cliques_[at(pivot)]) {
        join(other, fresh);
      } else if (dead_clique_[at(other)] == 0) {
        const Clique old = clique_[at(other)];
        for (std::size_t m = old.begin; m < old.begin + at(old.length); ++m) join(pool_[m], fresh);
        dead_clique_[at(other)] = 1;
      }
    }
    fresh.length = static_cast<Index>(pool_.size() - fresh.begin);
    clique_[at(pivot)] = fresh;
  }

  /// outside_[e] - stamp_ becomes the weight of clique e outside the new one.
  void measure_cliques_outside(Index pivot) {
    stamp_ += static_cast<std::int64_t>(weight_.size()) + 1;
    const Clique fresh = clique_[at(pivot)];
    for (std::size_t m = fresh.begin; m < fresh.begin + at(fresh.length); ++m) {
      const Index v = pool_[m];
      for (Index k = 0; k < cliques_[at(v)]; ++k) {
        const Index e = entry(v, k);
        if (dead_clique_[at(e)] != 0) continue;
        if (outside_[at(e)] < stamp_) outside_[at(e)] = stamp_ + clique_[at(e)].weight;
        outside_[at(e)] += weight_[at(v)];  // negative: v is marked
      }
    }
  }

  void update_members(Index pivot) {
    Clique& fresh = clique_[at(pivot)];
    for (std::size_t m = fresh.begin; m < fresh.begin + at(fresh.length); ++m) {
      const Index v = pool_[m];
      std::int64_t degree = 0;
      std::uint32_t hash = static_cast<std::uint32_t>(pivot);
      Index kept = 0;
      const Index old_cliques = cliques_[at(v)];
      for (Index k = 0; k < old_cliques; ++k) {
        const Index e = entry(v, k);
        if (dead_clique_[at(e)] != 0) continue;
        const std::int64_t beyond = outside_[at(e)] - stamp_;
        if (beyond == 0) {
          dead_clique_[at(e)] = 1;  // lies inside the new clique
          continue;
        }
        degree += beyond;
        hash += static_cast<std::uint32_t>(e);
        entry(v, kept++) = e;
      }
      const Index kept_cliques = kept;
      for (Index k = old_cliques; k < length_[at(v)]; ++k) {
        const Index other = entry(v, k);
        if (weight_[at(other)] <= 0) continue;
        degree += weight_[at(other)];
        hash += static_cast<std::uint32_t>(other);
        entry(v, kept++) = other;
      }
      if (degree == 0) {  // nothing outside the clique: v is eliminated with the pivot
        left_ += weight_[at(v)];
        fresh.weight += weight_[at(v)];
        weight_[at(v)] = 0;
        merged_into_[at(v)] = pivot;
        continue;
      }
      // The pivot or one of its cliques left v's list, so there is room for the new clique in front.
      entry(v, kept) = entry(v, kept_cliques);
      entry(v, kept_cliques) = entry(v, 0);
      entry(v, 0) = pivot;
      cliques_[at(v)] = kept_cliques + 1;
      length_[at(v)] = kept + 1;
      degree_[at(v)] = static_cast<Index>(std::min<std::int64_t>(degree_[at(v)], degree));
      const std::size_t slot = hash % hash_head_.size();
      hash_[at(v)] = static_cast<Index>(slot);
      hash_next_[at(v)] = hash_head_[slot];
      hash_head_[slot] = v;
    }
  }

  void merge_indistinguishable(Index pivot) {
    const Clique fresh = clique_[at(pivot)];
    for (std::size_t m = fresh.begin; m < fresh.begin + at(fresh.length); ++m) {
      const Index v = pool_[m];
      if (weight_[at(v)] == 0) continue;
      Index first = hash_head_[at(hash_[at(v)])];
      hash_head_[at(hash_[at(v)])] = -1;
      for (; first >= 0 && hash_next_[at(first)] >= 0; first = hash_next_[at(first)]) {
        ++mark_stamp_;
        for (Index k = 0; k < length_[at(first)]; ++k) mark_[at(entry(first, k))] = mark_stamp_;
        Index before = first;
        for (Index other = hash_next_[at(first)]; other >= 0; other = hash_next_[at(other)]) {
          if (!same_as_marked(first, other)) {
            before = other;
            continue;
          }
          weight_[at(first)] += weight_[at(other)];
          weight_[at(other)] = 0;
          merged_into_[at(other)] = first;
          hash_next_[at(before)] = hash_next_[at(other)];
        }
      }
    }
  }

  bool same_as_marked(Index first, Index other) {
    if (length_[at(first)] != length_[at(other)] || cliques_[at(first)] != cliques_[at(other)]) return false;
    for (Index k = 0; k < length_[at(other)]; ++k) {
      if (mark_[at(entry(other, k))] != mark_stamp_) return false;
    }
    return true;
  }

  void file_members(Index pivot) {
    Clique& fresh = clique_[at(pivot)];
    std::size_t kept = fresh.begin;
    for (std::size_t m = fresh.begin; m < fresh.begin + at(fresh.length); ++m) {
      const Index v = pool_[m];
      if (weight_[at(v)] == 0) continue;
      weight_[at(v)] = -weight_[at(v)];
      const Index inside = fresh.weight - weight_[at(v)];
      degree_[at(v)] = std::min(degree_[at(v)] + inside, left_ - weight_[at(v)]);
      file(v);
      pool_[kept++] = v;
    }
    fresh.length = static_cast<Index>(kept - fresh.begin);
    pool_.erase(pool_.begin() + static_cast<std::ptrdiff_t>(kept), pool_.end());
  }

  std::vector<Index> list_;  // of v: its cliques, then its remaining neighbours
  std::vector<Index> begin_;
  std::vector<Index> length_;
  std::vector<Index> cliques_;
  std::vector<Index> weight_;  // vertices merged in v; 0 gone; negative while v is in the new clique
  std::vector<Index> degree_;
  std::vector<Index> merged_into_;
  std::vector<Index> front_;
  std::vector<Index> head_, next_, previous_;
  std::vector<Index> hash_head_, hash_next_, hash_;
  std::vector<std::int64_t> outside_;
  std::vector<std::int64_t> mark_;
  std::vector<unsigned char> dead_clique_;
  std::vector<Clique> clique_;
  std::vector<Index> pool_;
  std::vector<Index> dense_;
  std::int64_t stamp_ = 1;
  std::int64_t mark_stamp_ = 0;
  std::size_t lowest_ = 0;
  Index left_;
  Index fronts_ = 0;
};

}  // namespace

FrontOrder minimum_degree_order(const PackedGraph& graph) {
  if (graph.order() == 0) return {};
  return QuotientGraph(graph).run();
}

}  // namespace kiloamp::sparse
