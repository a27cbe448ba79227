// Graphs of unfriendly shape, random matrices on them, and dense reference results.
#pragma once
#include <Eigen/Dense>
#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <limits>
#include <random>
#include <set>
#include <string>
#include <utility>
#include <vector>

#include "engine/sparse/symmetric_system.hpp"

namespace kiloamp::sparse::test {

struct Graph {
  std::string name;
  Index order = 0;
  std::vector<Edge> edges;
};

/// Edges without repeats, in random order and direction.
inline Graph finish(std::string name, Index order, const std::set<std::pair<Index, Index>>& pairs,
                    std::mt19937& random) {
  Graph graph{std::move(name), order, {}};
  std::vector<Index> label(static_cast<std::size_t>(order));
  for (Index v = 0; v < order; ++v) label[static_cast<std::size_t>(v)] = v;
  std::shuffle(label.begin(), label.end(), random);
  for (const auto& [a, b] : pairs) {
    const Index i = label[static_cast<std::size_t>(a)];
    const Index j = label[static_cast<std::size_t>(b)];
    graph.edges.push_back(random() % 2 == 0 ? Edge{i, j} : Edge{j, i});
  }
  std::shuffle(graph.edges.begin(), graph.edges.end(), random);
  return graph;
}

inline std::set<std::pair<Index, Index>> random_pairs(Index order, int count, std::mt19937& random) {
  std::set<std::pair<Index, Index>> pairs;
  for (int k = 0; k < count && order > 1; ++k) {
    const auto a = static_cast<Index>(random() % static_cast<unsigned>(order));
    const auto b = static_cast<Index>(random() % static_cast<unsigned>(order));
    if (a != b) pairs.insert({std::min(a, b), std::max(a, b)});
  }
  return pairs;
}

/// Chain, star, clique, grid, wheel, two hubs with parallel paths, islands, random graphs of several
/// densities.
inline std::vector<Graph> unfriendly_graphs(std::mt19937& random) {
  using Pairs = std::set<std::pair<Index, Index>>;
  std::vector<Graph> graphs;
  for (Index n = 0; n <= 2; ++n) graphs.push_back(finish("no edges", n, {}, random));
  graphs.push_back(finish("one edge", 2, {{0, 1}}, random));
  Pairs chain, star, clique, grid, wheel, bundle, cliques, blobs;
  for (Index v = 1; v < 60; ++v) chain.insert({v - 1, v});
  for (Index v = 1; v < 70; ++v) star.insert({0, v});
  for (Index v = 1; v < 14; ++v) {
    for (Index u = 0; u < v; ++u) clique.insert({u, v});
  }
  for (Index v = 0; v < 121; ++v) {
    if (v % 11 != 10) grid.insert({v, v + 1});
    if (v < 110) grid.insert({v, v + 11});
  }
  for (Index v = 1; v < 80; ++v)
    wheel.insert({0, v}), wheel.insert({std::min(v, v % 79 + 1), std::max(v, v % 79 + 1)});
  for (Index v = 2; v < 130; ++v) bundle.insert({0, v}), bundle.insert({1, v});
  for (Index k = 0; k < 8; ++k) {
    for (Index v = 0; v < 7; ++v) {
      for (Index u = 0; u < v; ++u) cliques.insert({7 * k + u, 7 * k + v});
    }
    if (k > 0 && k != 4) cliques.insert({7 * k - 1, 7 * k});
  }
  graphs.push_back(finish("chain", 60, chain, random));
  graphs.push_back(finish("star", 70, star, random));
  graphs.push_back(finish("clique", 14, clique, random));
  graphs.push_back(finish("grid", 121, grid, random));
  graphs.push_back(finish("wheel", 80, wheel, random));
  graphs.push_back(finish("two hubs", 130, bundle, random));
  graphs.push_back(finish("chained cliques in two islands", 56, cliques, random));
  for (const int percent : {60, 110, 150, 250, 500}) {
    const Index n = 40 + static_cast<Index>(random() % 80);
    graphs.push_back(finish("random, edges per row in percent: " + std::to_string(percent), n,
                            random_pairs(n, n * percent / 100, random), random));
  }
  return graphs;
}

/// A few thousand rows: a grid with shortcuts, trees hanging from it; large enough to be cut into tasks.
inline Graph large_graph(Index side, std::mt19937& random) {
  std::set<std::pair<Index, Index>> pairs;
  const Index core = side * side;
  for (Index v = 0; v < core; ++v) {
    if (v % side != side - 1) pairs.insert({v, v + 1});
    if (v + side < core) pairs.insert({v, v + side});
  }
  const Index order = 2 * core;
  for (Index v = core; v < order; ++v) {
    pairs.insert({static_cast<Index>(random() % static_cast<unsigned>(v)), v});
  }
  return finish("grid with trees", order, pairs, random);
}

template <typename Scalar>
Scalar random_scalar(std::mt19937& random) {
  std::uniform_real_distribution<double> part(-1, 1);
  if constexpr (std::is_same_v<Scalar, double>) {
    return part(random);
  } else {
    const double re = part(random);
    return {re, part(random)};
  }
}

/// Random entries with a diagonal that dominates its row by the factor `dominance`.
template <typename Scalar, int Lanes>
Values<Scalar, Lanes> random_values(const Graph& graph, double dominance, std::mt19937& random) {
  Values<Scalar, Lanes> values;
  std::vector<std::array<double, Lanes>> sums(static_cast<std::size_t>(graph.order));
  values.diagonal.resize(sums.size());
  for (auto& sum : sums) sum.fill(0.3);
  for (const Edge& edge : graph.edges) {
    auto& entry = values.off_diagonal.emplace_back();
    for (std::size_t s = 0; s < Lanes; ++s) {
      entry[s] = random_scalar<Scalar>(random);
      sums[static_cast<std::size_t>(edge.i)][s] += std::abs(entry[s]);
      sums[static_cast<std::size_t>(edge.j)][s] += std::abs(entry[s]);
    }
  }
  for (std::size_t v = 0; v < sums.size(); ++v) {
    for (std::size_t s = 0; s < Lanes; ++s) {
      Scalar turn = random_scalar<Scalar>(random);
      turn /= std::abs(turn);
      values.diagonal[v][s] = dominance * sums[v][s] * turn;
    }
  }
  return values;
}

template <typename Scalar>
using Dense = Eigen::Matrix<Scalar, Eigen::Dynamic, Eigen::Dynamic>;

template <typename Scalar, int Lanes>
Dense<Scalar> dense_matrix(const Graph& graph, const Values<Scalar, Lanes>& values, int lane) {
  const auto s = static_cast<std::size_t>(lane);
  Dense<Scalar> a = Dense<Scalar>::Zero(graph.order, graph.order);
  for (Index v = 0; v < graph.order; ++v) a(v, v) = values.diagonal[static_cast<std::size_t>(v)][s];
  for (std::size_t e = 0; e < graph.edges.size(); ++e) {
    a(graph.edges[e].i, graph.edges[e].j) = a(graph.edges[e].j, graph.edges[e].i) = values.off_diagonal[e][s];
  }
  return a;
}

template <typename Scalar, int Lanes>
Dense<Scalar> dense_inverse(const Graph& graph, const Values<Scalar, Lanes>& values, int lane) {
  if (graph.order == 0) return {};
  return dense_matrix(graph, values, lane).fullPivLu().inverse();
}

/// True when |found - expected| <= tolerance; false for NaN and infinity on either side.
template <typename Scalar>
bool close(const Scalar& found, const Scalar& expected, double tolerance) {
  return std::abs(found - expected) <= tolerance && std::isfinite(std::abs(found));
}

template <typename Scalar>
double largest(const Dense<Scalar>& a) {
  return a.size() == 0 ? 0 : a.cwiseAbs().maxCoeff();
}

inline std::shared_ptr<const Analysis> analyse(const Graph& graph) {
  return std::make_shared<const Analysis>(graph.order, graph.edges);
}

}  // namespace kiloamp::sparse::test
