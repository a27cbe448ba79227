// Claims about engine/sparse/low_rank_change.hpp against dense recomputation.
#include <boost/test/unit_test.hpp>

#include "tests/unit/sparse/random_systems.hpp"

namespace kiloamp::sparse {
namespace {

using test::Dense;
using test::Graph;
using Complex = std::complex<double>;

/// Per unit of the largest |Z'_ij|; the changes below keep the matrix well conditioned.
constexpr double kRoundoff = 1e-9;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
struct Change {
  std::vector<SparseVector<Scalar, Lanes>> u;
  std::vector<std::array<Scalar, Lanes>> d;
};

template <typename Scalar, int Lanes>
Change<Scalar, Lanes> random_change(Index order, int rank, std::mt19937& random) {
  Change<Scalar, Lanes> change;
  change.u.resize(at(rank));
  change.d.resize(at(rank * rank));
  for (auto& vector : change.u) {
    std::set<Index> rows;
    for (int k = 0; k < 3; ++k) rows.insert(static_cast<Index>(random() % static_cast<unsigned>(order)));
    for (const Index row : rows) {
      auto& term = vector.emplace_back();
      term.row = row;
      for (auto& value : term.value) value = test::random_scalar<Scalar>(random);
    }
  }
  for (int a = 0; a < rank; ++a) {
    for (int b = 0; b <= a; ++b) {
      std::array<Scalar, Lanes> value;
      for (auto& one : value) one = 0.3 * test::random_scalar<Scalar>(random);
      value[at(rank % Lanes)] = 0;  // no change at all in one lane
      change.d[at(a * rank + b)] = change.d[at(b * rank + a)] = value;
    }
  }
  return change;
}

template <typename Scalar, int Lanes>
Dense<Scalar> changed_inverse(const Graph& graph, const Values<Scalar, Lanes>& values,
                              const Change<Scalar, Lanes>& change, int lane) {
  const auto rank = static_cast<Eigen::Index>(change.u.size());
  Dense<Scalar> u = Dense<Scalar>::Zero(graph.order, rank);
  Dense<Scalar> d(rank, rank);
  for (Eigen::Index a = 0; a < rank; ++a) {
    for (const auto& term : change.u[static_cast<std::size_t>(a)]) u(term.row, a) += term.value[at(lane)];
    for (Eigen::Index b = 0; b < rank; ++b)
      d(a, b) = change.d[static_cast<std::size_t>(a * rank + b)][at(lane)];
  }
  return (test::dense_matrix(graph, values, lane) + u * d * u.transpose()).fullPivLu().inverse();
}

template <typename Scalar, int Lanes>
void check_rank(const Graph& graph, int rank, std::mt19937& random) {
  const auto values = test::random_values<Scalar, Lanes>(graph, 1.5, random);
  const Factorisation<Scalar, Lanes> factorisation(test::analyse(graph), values);
  const auto change = random_change<Scalar, Lanes>(graph.order, rank, random);
  const LowRankChange<Scalar, Lanes> changed(factorisation, change.u, change.d);
  auto inverse = factorisation.selected_inverse();
  changed.change(graph.edges, inverse);
  for (int lane = 0; lane < Lanes; ++lane) {
    const Dense<Scalar> expected = changed_inverse(graph, values, change, lane);
    const Dense<Scalar> before = test::dense_inverse(graph, values, lane);
    if (test::largest(expected) > 1e3 * test::largest(before)) continue;
    const double tolerance = kRoundoff * test::largest(expected);
    BOOST_TEST((changed.outcome()[at(lane)] == ChangeOutcome::kSolved));
    for (Index v = 0; v < graph.order; ++v) {
      BOOST_TEST(test::close<Scalar>(inverse.diagonal[at(v)][at(lane)], expected(v, v), tolerance));
    }
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const Edge& edge = graph.edges[e];
      BOOST_TEST(test::close<Scalar>(inverse.off_diagonal[e][at(lane)], expected(edge.i, edge.j), tolerance));
    }
    const Index far = graph.order - 1;
    const auto single = changed.changed_entry(0, far, factorisation.inverse_entry(0, far));
    BOOST_TEST(test::close<Scalar>(single[at(lane)], expected(0, far), tolerance));
  }
}

BOOST_AUTO_TEST_SUITE(low_rank_change)

BOOST_AUTO_TEST_CASE(changed_inverse_agrees_with_dense_recomputation) {
  for (unsigned seed = 701; seed < 707; ++seed) {
    std::mt19937 random(seed);
    for (const Graph& graph : test::unfriendly_graphs(random)) {
      if (graph.order == 0) continue;
      for (const int rank : {0, 1, 2, 5}) {
        BOOST_TEST_CONTEXT("seed " << seed << ", " << graph.name << ", rank " << rank) {
          check_rank<Complex, 3>(graph, rank, random);
          if (rank == 2) check_rank<double, 1>(graph, rank, random);
        }
      }
    }
  }
}

/// Ring 0-1-2-3 with a tail 3-4-5; earthed at row 0 (lanes 0 and 1) or at rows 0 and 5 (lane 2).
struct TailedRing {
  Graph graph{"tailed ring", 6, {{0, 1}, {1, 2}, {2, 3}, {0, 3}, {3, 4}, {4, 5}}};
  std::vector<std::array<Complex, 3>> y;
  Values<Complex, 3> values;

  TailedRing() {
    values.diagonal.resize(6);
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const auto k = static_cast<double>(e);
      y.push_back({1.0 / Complex(0.01, 0.1 + 0.02 * k), 1.0 / Complex(0.02, 0.11 + 0.02 * k),
                   1.0 / Complex(0.03, 0.3)});
      auto& entry = values.off_diagonal.emplace_back();
      for (std::size_t s = 0; s < 3; ++s) {
        entry[s] = -y[e][s];
        values.diagonal[at(graph.edges[e].i)][s] += y[e][s];
        values.diagonal[at(graph.edges[e].j)][s] += y[e][s];
      }
    }
    for (std::size_t s = 0; s < 3; ++s) values.diagonal[0][s] += Complex(0.1, -8);
    values.diagonal[5][2] += Complex(0.2, -4);
  }

  struct Outage {
    SparseVector<Complex, 3> u;
    std::array<Complex, 3> d;
  };
  Outage outage(std::size_t e) const {
    Outage change;
    change.u = {{graph.edges[e].i, {1, 1, 1}}, {graph.edges[e].j, {-1, -1, -1}}};
    for (std::size_t s = 0; s < 3; ++s) change.d[s] = -y[e][s];
    return change;
  }
};

BOOST_AUTO_TEST_CASE(each_outage_agrees_with_dense_recomputation_and_bridges_split) {
  const TailedRing ring;
  const Factorisation<Complex, 3> factorisation(test::analyse(ring.graph), ring.values);
  const auto before = factorisation.selected_inverse();
  for (std::size_t e = 0; e < ring.graph.edges.size(); ++e) {
    const Change<Complex, 3> change{{ring.outage(e).u}, {ring.outage(e).d}};
    const LowRankChange<Complex, 3> response(factorisation, change.u, change.d);
    for (int lane = 0; lane < 3; ++lane) {
      // The tail hangs on branches 4 and 5; it is earthed at its end in lane 2 only.
      const bool bridge = e >= 4 && lane != 2;
      BOOST_TEST((response.outcome()[at(lane)] == (bridge ? ChangeOutcome::kSplits : ChangeOutcome::kSolved)),
                 "outage " << e << ", lane " << lane);
      if (bridge) continue;
      const Dense<Complex> expected = changed_inverse(ring.graph, ring.values, change, lane);
      for (Index v = 0; v < 6; ++v) {
        const auto after = response.changed_entry(v, v, before.diagonal[at(v)]);
        BOOST_TEST(test::close<Complex>(after[at(lane)], expected(v, v), 1e-12));
      }
    }
  }
}

BOOST_AUTO_TEST_CASE(two_outages_that_split_only_together_are_reported) {
  const TailedRing ring;
  const Factorisation<Complex, 3> factorisation(test::analyse(ring.graph), ring.values);
  const std::vector<SparseVector<Complex, 3>> u{ring.outage(0).u, ring.outage(1).u};
  const std::vector<std::array<Complex, 3>> d{ring.outage(0).d, {}, {}, ring.outage(1).d};
  const LowRankChange<Complex, 3> both(factorisation, u, d);  // row 1 loses both its branches
  for (const ChangeOutcome outcome : both.outcome()) BOOST_TEST((outcome == ChangeOutcome::kSplits));
  BOOST_TEST(std::isnan(both.changed_entry(2, 2, {})[0].real()));
  const std::vector<SparseVector<Complex, 3>> apart{ring.outage(0).u, ring.outage(5).u};
  const std::vector<std::array<Complex, 3>> d_apart{ring.outage(0).d, {}, {}, ring.outage(5).d};
  const LowRankChange<Complex, 3> tail(factorisation, apart, d_apart);
  BOOST_TEST((tail.outcome()[0] == ChangeOutcome::kSplits));
  BOOST_TEST((tail.outcome()[2] == ChangeOutcome::kSolved));
}

BOOST_AUTO_TEST_CASE(outages_in_a_large_graph_agree_with_refactorising) {
  std::mt19937 random(77);
  const Graph graph = test::large_graph(20, random);
  auto values = test::random_values<Complex, 3>(graph, 1.2, random);
  const auto analysis = test::analyse(graph);
  const Factorisation<Complex, 3> factorisation(analysis, values);
  const auto before = factorisation.selected_inverse();
  for (std::size_t e = 0; e < graph.edges.size(); e += 40) {
    const std::vector<SparseVector<Complex, 3>> u{
        {{graph.edges[e].i, {1, 1, 1}}, {graph.edges[e].j, {-1, -1, 0}}}};
    const std::vector<std::array<Complex, 3>> d{values.off_diagonal[e]};
    auto found = before.diagonal;
    LowRankChange<Complex, 3>(factorisation, u, d).change_diagonal(found);
    auto changed = values;
    for (std::size_t s = 0; s < 3; ++s) {
      changed.diagonal[at(graph.edges[e].i)][s] += d[0][s];
      if (s == 2) continue;  // in lane 2 the branch ends at one row
      changed.diagonal[at(graph.edges[e].j)][s] += d[0][s];
      changed.off_diagonal[e][s] -= d[0][s];
    }
    const auto expected = Factorisation<Complex, 3>(analysis, changed).selected_inverse();
    bool same = true;
    for (std::size_t v = 0; v < expected.diagonal.size(); ++v) {
      for (std::size_t s = 0; s < 3; ++s) {
        const double tolerance = 1e-10 * std::abs(expected.diagonal[v][s]);
        same = same && test::close<Complex>(found[v][s], expected.diagonal[v][s], tolerance);
      }
    }
    BOOST_TEST(same, "branch " << e);
  }
}

BOOST_AUTO_TEST_CASE(changes_of_a_pivoting_lane_are_right_too) {
  const Graph graph{"anti-diagonal", 2, {{0, 1}}};
  const Values<double, 1> values{{{0.0}, {0.0}}, {{1.0}}};
  const Factorisation<double, 1> factorisation(test::analyse(graph), values);
  // [[3, 1], [1, 0]] has the inverse [[0, 1], [1, -3]].
  const std::vector<SparseVector<double, 1>> u{{{0, {1.0}}}};
  const std::vector<std::array<double, 1>> d{{3.0}};
  const LowRankChange<double, 1> change(factorisation, u, d);
  BOOST_TEST(test::close<double>(change.changed_entry(1, 1, {0.0})[0], -3.0, 1e-15));
  BOOST_TEST(test::close<double>(change.changed_entry(0, 0, {0.0})[0], 0.0, 1e-15));
  BOOST_TEST(test::close<double>(change.changed_entry(0, 1, {1.0})[0], 1.0, 1e-15));
}

BOOST_AUTO_TEST_SUITE_END()

}  // namespace
}  // namespace kiloamp::sparse
