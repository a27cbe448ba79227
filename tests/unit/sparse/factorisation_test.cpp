// Claims about engine/sparse/factorisation.hpp against dense algebra (Eigen, full pivoting).
#include <boost/test/unit_test.hpp>

#include "tests/unit/sparse/random_systems.hpp"

namespace kiloamp::sparse {
namespace {

using test::Dense;
using test::Graph;

/// Per unit of the largest |Z_ij|: rows dominate by 1.3 at least, so Z is well conditioned.
constexpr double kRoundoff = 1e-11;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
void check_all_entries(const Graph& graph, std::mt19937& random) {
  using Entry = std::array<Scalar, Lanes>;
  const auto values = test::random_values<Scalar, Lanes>(graph, 1.3, random);
  const Factorisation<Scalar, Lanes> factorisation(test::analyse(graph), values);
  const auto selected = factorisation.selected_inverse();
  BOOST_REQUIRE(selected.diagonal.size() == at(graph.order));
  BOOST_REQUIRE(selected.off_diagonal.size() == graph.edges.size());
  std::vector<Index> all(at(graph.order));
  for (Index v = 0; v < graph.order; ++v) all[at(v)] = v;
  std::vector<Entry> columns(at(graph.order) * at(graph.order));
  factorisation.columns(all, columns);
  for (int lane = 0; lane < Lanes; ++lane) {
    const auto s = at(lane);
    const Dense<Scalar> z = test::dense_inverse(graph, values, lane);
    const double tolerance = kRoundoff * test::largest(z);
    BOOST_TEST(factorisation.accuracy()[s].residual < 1e-12);
    BOOST_TEST(!factorisation.accuracy()[s].pivoting);
    bool diagonal = true, pattern = true, everywhere = true, single = true;
    for (Index v = 0; v < graph.order; ++v) {
      diagonal = diagonal && test::close<Scalar>(selected.diagonal[at(v)][s], z(v, v), tolerance);
      for (Index u = 0; u < graph.order; ++u) {
        everywhere = everywhere &&
                     test::close<Scalar>(columns[at(v) * at(graph.order) + at(u)][s], z(u, v), tolerance);
      }
    }
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const Edge& edge = graph.edges[e];
      pattern = pattern && test::close<Scalar>(selected.off_diagonal[e][s], z(edge.i, edge.j), tolerance);
    }
    for (int k = 0; k < 10 && graph.order > 0; ++k) {
      const auto i = static_cast<Index>(random() % static_cast<unsigned>(graph.order));
      const auto j = static_cast<Index>(random() % static_cast<unsigned>(graph.order));
      single = single && test::close<Scalar>(factorisation.inverse_entry(i, j)[s], z(i, j), tolerance);
    }
    BOOST_TEST(diagonal, "Z_ii, lane " << lane);
    BOOST_TEST(pattern, "Z_ij on the pattern, lane " << lane);
    BOOST_TEST(everywhere, "columns, lane " << lane);
    BOOST_TEST(single, "single entries, lane " << lane);
  }
}

BOOST_AUTO_TEST_SUITE(factorisation)

template <typename Scalar, int Lanes>
void check_many_graphs(unsigned first_seed, unsigned last_seed) {
  for (unsigned seed = first_seed; seed <= last_seed; ++seed) {
    std::mt19937 random(seed);
    for (const Graph& graph : test::unfriendly_graphs(random)) {
      BOOST_TEST_CONTEXT("seed " << seed << ", " << graph.name) {
        check_all_entries<Scalar, Lanes>(graph, random);
      }
    }
  }
}

BOOST_AUTO_TEST_CASE(complex_single_lane_agrees_with_dense_inverse) {
  check_many_graphs<std::complex<double>, 1>(101, 106);
}
BOOST_AUTO_TEST_CASE(complex_three_lanes_agree_with_dense_inverse) {
  check_many_graphs<std::complex<double>, 3>(201, 206);
}
BOOST_AUTO_TEST_CASE(complex_four_lanes_agree_with_dense_inverse) {
  check_many_graphs<std::complex<double>, 4>(301, 303);
}
BOOST_AUTO_TEST_CASE(real_single_lane_agrees_with_dense_inverse) { check_many_graphs<double, 1>(401, 406); }
BOOST_AUTO_TEST_CASE(real_two_lanes_agree_with_dense_inverse) { check_many_graphs<double, 2>(501, 504); }
BOOST_AUTO_TEST_CASE(real_four_lanes_agree_with_dense_inverse) { check_many_graphs<double, 4>(601, 603); }

BOOST_AUTO_TEST_CASE(general_right_hand_sides_satisfy_the_system) {
  using Scalar = std::complex<double>;
  for (unsigned seed = 31; seed < 36; ++seed) {
    std::mt19937 random(seed);
    for (const Graph& graph : test::unfriendly_graphs(random)) {
      const auto values = test::random_values<Scalar, 3>(graph, 1.3, random);
      const Factorisation<Scalar, 3> factorisation(test::analyse(graph), values);
      std::vector<std::array<Scalar, 3>> b(at(graph.order));
      for (auto& entry : b) {
        for (auto& value : entry) value = test::random_scalar<Scalar>(random);
      }
      auto x = b;
      factorisation.solve(x);
      for (int lane = 0; lane < 3; ++lane) {
        Eigen::VectorXcd solution(graph.order), rest(graph.order);
        for (Index v = 0; v < graph.order; ++v) {
          solution(v) = x[at(v)][at(lane)];
          rest(v) = b[at(v)][at(lane)];
        }
        if (graph.order > 0) rest -= test::dense_matrix(graph, values, lane) * solution;
        for (Index v = 0; v < graph.order; ++v) {
          BOOST_TEST(test::close<Scalar>(rest(v), 0, 1e-11), "seed " << seed << ", " << graph.name);
        }
      }
    }
  }
}

template <typename Scalar, int Lanes>
void check_threads(Index side, unsigned seed) {
  std::mt19937 random(seed);
  const Graph graph = test::large_graph(side, random);
  const auto values = test::random_values<Scalar, Lanes>(graph, 1.1, random);
  const auto analysis = test::analyse(graph);
  const Factorisation<Scalar, Lanes> one(analysis, values, 1);
  const auto expected = one.selected_inverse(1);
  for (const int threads : {2, 3, 7}) {
    const Factorisation<Scalar, Lanes> other(analysis, values, threads);
    const auto found = other.selected_inverse(threads);
    // Bit for bit: compared as numbers, none of which is NaN (checked by the equality itself).
    BOOST_TEST((found.diagonal == expected.diagonal), threads << " threads");
    BOOST_TEST((found.off_diagonal == expected.off_diagonal), threads << " threads");
  }
  std::vector<Index> probes{0, graph.order / 3, graph.order - 1};
  std::vector<std::array<Scalar, Lanes>> column(at(graph.order));
  for (const Index k : probes) {
    one.column(k, column);
    for (int s = 0; s < Lanes; ++s) {
      BOOST_TEST(test::close<Scalar>(column[at(k)][at(s)], expected.diagonal[at(k)][at(s)], 1e-10));
    }
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const Edge& edge = graph.edges[e];
      if (edge.i != k && edge.j != k) continue;
      const Index other = edge.i == k ? edge.j : edge.i;
      BOOST_TEST(test::close<Scalar>(column[at(other)][0], expected.off_diagonal[e][0], 1e-10));
    }
  }
}

BOOST_AUTO_TEST_CASE(threads_do_not_change_a_bit) {
  check_threads<std::complex<double>, 1>(100, 41);
  check_threads<std::complex<double>, 3>(120, 42);
  check_threads<double, 2>(120, 43);
}

BOOST_AUTO_TEST_CASE(a_million_rows_in_a_chain_solve) {
  // Tridiagonal -1, 2.5, -1 far from its ends: Z_ij = exp(-t |i - j|) / (2 sinh t) with 2 cosh t = 2.5, so t
  // = ln 2.
  constexpr Index kOrder = 1'000'000;
  std::vector<Edge> edges;
  Values<double, 1> values;
  values.diagonal.assign(kOrder, {2.5});
  for (Index v = 1; v < kOrder; ++v) edges.push_back({v - 1, v});
  values.off_diagonal.assign(edges.size(), {-1.0});
  const Factorisation<double, 1> factorisation(std::make_shared<const Analysis>(kOrder, edges), values, 2);
  const auto selected = factorisation.selected_inverse(2);
  for (const Index k : {1000, 500'000, 999'900}) {
    BOOST_TEST(test::close<double>(selected.diagonal[at(k)][0], 2.0 / 3, 1e-14));
    BOOST_TEST(test::close<double>(selected.off_diagonal[at(k)][0], 1.0 / 3, 1e-14));
    BOOST_TEST(test::close<double>(factorisation.inverse_entry(k, k - 5)[0], 2.0 / 3 / 32, 1e-14));
  }
}

BOOST_AUTO_TEST_CASE(refactorising_equals_a_new_factorisation) {
  std::mt19937 random(5);
  const Graph graph = test::large_graph(30, random);
  const auto analysis = test::analyse(graph);
  const auto first = test::random_values<std::complex<double>, 3>(graph, 1.2, random);
  const auto second = test::random_values<std::complex<double>, 3>(graph, 1.2, random);
  Factorisation<std::complex<double>, 3> reused(analysis, first);
  reused.refactorise(second);
  const Factorisation<std::complex<double>, 3> fresh(analysis, second);
  BOOST_TEST((reused.selected_inverse().diagonal == fresh.selected_inverse().diagonal));
}

BOOST_AUTO_TEST_SUITE_END()

}  // namespace
}  // namespace kiloamp::sparse
