#include "engine/sparse/graph_reduction.hpp"

#include <cstddef>

namespace kiloamp::sparse {
namespace {

/// More neighbours than this make a hub. Searching a list this long costs about one cache miss.
constexpr Index kHubDegree = 48;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

class Reducer {
 public:
  Reducer(Index order, std::span<const Edge> edges)
      : lists_(at(order)), degree_(at(order), 0), round_(at(order), 0), eliminated_(at(order), 0) {
    for (const Edge& edge : edges) {
      ++degree_[at(edge.i)];
      ++degree_[at(edge.j)];
    }
    std::size_t end = 0;
    for (Index v = 0; v < order; ++v) {
      lists_[at(v)] = {end, 0, degree_[at(v)] + 1};
      end += at(degree_[at(v)]) + 1;
    }
    pool_.reserve(2 * end);  // what lists of the core need when they grow: moving all would cost more
    pool_.resize(end);
    for (const Edge& edge : edges) {
      push(edge.i, edge.j);
      push(edge.j, edge.i);
    }
  }

  Reduction run() {
    const auto order = static_cast<Index>(lists_.size());
    result_.sequence.reserve(lists_.size());
    result_.neighbours.reserve(lists_.size());
    for (Index v = 0; v < order; ++v) offer(v);
    for (std::size_t bucket = lowest_bucket(); bucket < kBuckets; bucket = lowest_bucket()) {
      round_rows_.swap(waiting_[bucket]);
      ++current_round_;
      for (const Index v : round_rows_) {
        if (eliminated_[at(v)] != 0 || degree_[at(v)] > kLargestReducedDegree) continue;
        if (round_[at(v)] == current_round_ || at(degree_[at(v)]) > bucket) {
          offer(v);
        } else {
          eliminate(v);
        }
      }
      round_rows_.clear();
    }
    number_vertices();
    return std::move(result_);
  }

 private:
  struct List {
    std::size_t begin;
    Index length;
    Index capacity;
  };
  static constexpr std::size_t kBuckets = kLargestReducedDegree + 1;

  std::span<Index> list(Index v) {
    return std::span<Index>(pool_).subspan(lists_[at(v)].begin, at(lists_[at(v)].length));
  }

  void offer(Index v) {
    if (degree_[at(v)] <= kLargestReducedDegree) waiting_[at(degree_[at(v)])].push_back(v);
  }

  std::size_t lowest_bucket() const {
    std::size_t bucket = 0;
    while (bucket < kBuckets && waiting_[bucket].empty()) ++bucket;
    return bucket;
  }

  bool is_hub(Index v) const { return degree_[at(v)] > kHubDegree; }

  /// Drops eliminated rows from v's list.
  void compact(Index v) {
    Index kept = 0;
    const std::span<Index> all = list(v);
    for (const Index other : all) {
      if (eliminated_[at(other)] == 0) all[at(kept++)] = other;
    }
    lists_[at(v)].length = kept;
  }

  void push(Index v, Index other) {
    List& mine = lists_[at(v)];
    if (mine.length == mine.capacity) {
      compact(v);
      if (mine.length > mine.capacity / 2) move_to_end(mine);
    }
    pool_[mine.begin + at(mine.length++)] = other;
  }

  void move_to_end(List& mine) {
    const std::size_t from = mine.begin;
    mine.begin = pool_.size();
    mine.capacity = 2 * mine.capacity + 2;
    pool_.resize(pool_.size() + at(mine.capacity));
    for (std::size_t k = 0; k < at(mine.length); ++k) pool_[mine.begin + k] = pool_[from + k];
  }

  void eliminate(Index v) {
    compact(v);
    std::array<Index, kLargestReducedDegree> around{-1, -1, -1};
    const std::size_t count = at(lists_[at(v)].length);
    std::size_t hubs = 0;
    for (std::size_t a = 0; a < count; ++a) {
      around[a] = list(v)[a];
      hubs += is_hub(around[a]) ? 1 : 0;
    }
    if (hubs > 1) return;  // finding out whether two hubs are neighbours would cost a long search
    eliminated_[at(v)] = 1;
    std::array<std::array<bool, kLargestReducedDegree>, kLargestReducedDegree> joined{};
    for (std::size_t a = 0; a < count && count > 1; ++a) {
      if (is_hub(around[a])) continue;
      compact(around[a]);
      for (const Index other : list(around[a])) {
        for (std::size_t b = 0; b < count; ++b) {
          if (other == around[b]) joined[a][b] = joined[b][a] = true;
        }
      }
    }
    for (std::size_t a = 0; a < count; ++a) {
      --degree_[at(around[a])];
      for (std::size_t b = 0; b < count; ++b) {
        if (a == b || joined[a][b]) continue;
        push(around[a], around[b]);
        ++degree_[at(around[a])];
      }
    }
    for (std::size_t a = 0; a < count; ++a) {
      round_[at(around[a])] = current_round_;
      offer(around[a]);
    }
    result_.sequence.push_back(v);
    result_.neighbours.push_back(around);
  }

  /// Lists the core and turns neighbours from rows to vertices.
  void number_vertices() {
    std::vector<Index>& vertex_of = round_;  // free now
    Index vertex = 0;
    for (const Index v : result_.sequence) vertex_of[at(v)] = vertex++;
    const Index first = vertex;
    result_.core.reserve(lists_.size() - result_.sequence.size());
    for (Index v = 0; v < static_cast<Index>(lists_.size()); ++v) {
      if (eliminated_[at(v)] != 0) continue;
      vertex_of[at(v)] = vertex++;
      result_.core.push_back(v);
    }
    for (auto& around : result_.neighbours) {
      for (Index& other : around) other = other < 0 ? -1 : vertex_of[at(other)];
    }
    PackedGraph& graph = result_.core_graph;
    graph.begin.reserve(result_.core.size() + 1);
    for (const Index v : result_.core) {
      for (const Index other : list(v)) {
        if (eliminated_[at(other)] == 0) graph.adjacency.push_back(vertex_of[at(other)] - first);
      }
      graph.begin.push_back(static_cast<Index>(graph.adjacency.size()));
    }
  }

  std::vector<List> lists_;
  std::vector<Index> pool_;
  std::vector<Index> degree_;
  std::vector<Index> round_;
  std::vector<unsigned char> eliminated_;
  std::array<std::vector<Index>, kBuckets> waiting_;
  std::vector<Index> round_rows_;
  Index current_round_ = 0;
  Reduction result_;
};

}  // namespace

Reduction reduce_graph(Index order, std::span<const Edge> edges) { return Reducer(order, edges).run(); }

}  // namespace kiloamp::sparse
