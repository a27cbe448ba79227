// Matrices that elimination without pivoting handles badly, and singular ones.
#include <boost/test/unit_test.hpp>

#include "engine/sparse/residual_probe.hpp"
#include "tests/unit/sparse/random_systems.hpp"

namespace kiloamp::sparse {
namespace {

using test::Dense;
using test::Graph;
using Complex = std::complex<double>;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
void check_against_dense(const Graph& graph, const Values<Scalar, Lanes>& values,
                         const Factorisation<Scalar, Lanes>& factorisation, double tolerance) {
  const auto selected = factorisation.selected_inverse();
  std::vector<std::array<Scalar, Lanes>> column(at(graph.order));
  for (int lane = 0; lane < Lanes; ++lane) {
    const Dense<Scalar> z = test::dense_inverse(graph, values, lane);
    const double allowed = tolerance * test::largest(z);
    for (Index v = 0; v < graph.order; ++v) {
      BOOST_TEST(test::close<Scalar>(selected.diagonal[at(v)][at(lane)], z(v, v), allowed));
      factorisation.column(v, column);
      for (Index u = 0; u < graph.order; ++u) {
        BOOST_REQUIRE(test::close<Scalar>(column[at(u)][at(lane)], z(u, v), allowed));
      }
    }
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const Edge& edge = graph.edges[e];
      BOOST_TEST(test::close<Scalar>(selected.off_diagonal[e][at(lane)], z(edge.i, edge.j), allowed));
    }
  }
}

BOOST_AUTO_TEST_SUITE(trust)

BOOST_AUTO_TEST_CASE(zero_diagonal_is_taken_over_by_pivoting) {
  const Graph graph{"anti-diagonal", 2, {{0, 1}}};
  Values<double, 1> values{{{0.0}, {0.0}}, {{1.0}}};
  const Factorisation<double, 1> factorisation(test::analyse(graph), values);
  BOOST_TEST(factorisation.accuracy()[0].pivoting);
  BOOST_TEST(factorisation.accuracy()[0].residual <= kTrustedResidual);
  const auto selected = factorisation.selected_inverse();
  BOOST_TEST(selected.diagonal[0][0] == 0.0);
  BOOST_TEST(selected.off_diagonal[0][0] == 1.0);
  BOOST_TEST(factorisation.inverse_entry(0, 1)[0] == 1.0);
}

BOOST_AUTO_TEST_CASE(one_bad_lane_leaves_the_others_alone) {
  std::mt19937 random(17);
  for (const Graph& graph : test::unfriendly_graphs(random)) {
    if (graph.edges.empty()) continue;
    auto values = test::random_values<Complex, 3>(graph, 1.4, random);
    const Factorisation<Complex, 3> sound(test::analyse(graph), values);
    for (auto& entry : values.diagonal) entry[1] = 0;
    const Dense<Complex> a = test::dense_matrix(graph, values, 1);
    const auto singular_values = a.bdcSvd().singularValues();
    if (singular_values.minCoeff() < 1e-3 * singular_values.maxCoeff()) continue;
    BOOST_TEST_CONTEXT(graph.name) {
      const Factorisation<Complex, 3> factorisation(test::analyse(graph), values);
      BOOST_TEST(factorisation.accuracy()[1].pivoting);
      BOOST_TEST(!factorisation.accuracy()[0].pivoting);
      BOOST_TEST(!factorisation.accuracy()[2].pivoting);
      check_against_dense(graph, values, factorisation, 1e-10);
      const auto before = sound.selected_inverse();
      const auto after = factorisation.selected_inverse();
      for (std::size_t v = 0; v < after.diagonal.size(); ++v) {
        BOOST_TEST((after.diagonal[v][0] == before.diagonal[v][0]));
        BOOST_TEST((after.diagonal[v][2] == before.diagonal[v][2]));
      }
    }
  }
}

/// Network matrix of reactances: -y between the ends, +y on both diagonals, `earth` at row 0.
Values<Complex, 1> network_values(const Graph& graph, const std::vector<Complex>& admittance, Complex earth) {
  Values<Complex, 1> values;
  values.diagonal.assign(at(graph.order), {Complex(0)});
  for (std::size_t e = 0; e < graph.edges.size(); ++e) {
    values.off_diagonal.push_back({-admittance[e]});
    values.diagonal[at(graph.edges[e].i)][0] += admittance[e];
    values.diagonal[at(graph.edges[e].j)][0] += admittance[e];
  }
  if (graph.order > 0) values.diagonal[0][0] += earth;
  return values;
}

BOOST_AUTO_TEST_CASE(series_capacitors_and_negative_star_arms_stay_accurate) {
  int hurt = 0;
  for (unsigned seed = 51; seed < 91; ++seed) {
    std::mt19937 random(seed);
    const Index n = 30 + static_cast<Index>(random() % 50);
    Graph graph = test::finish("network", n, test::random_pairs(n, 2 * n, random), random);
    std::set<std::pair<Index, Index>> known;
    for (const Edge& edge : graph.edges) known.insert(std::minmax(edge.i, edge.j));
    for (Index v = 1; v < n; ++v) {
      if (known.insert({v - 1, v}).second) graph.edges.push_back({v - 1, v});
    }
    std::vector<Complex> admittance;
    std::uniform_real_distribution<double> reactance(0.05, 0.5);
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const double x = reactance(random);
      // Every fourth branch is capacitive; some of them cancel a neighbour exactly (x and -x in series).
      admittance.push_back(1.0 / Complex(0.0, random() % 4 == 0 ? (random() % 2 == 0 ? -0.25 : -x)
                                                                : (random() % 3 == 0 ? 0.25 : x)));
    }
    const auto values = network_values(graph, admittance, Complex(0, -10));
    const Dense<Complex> a = test::dense_matrix(graph, values, 0);
    const auto singular_values = a.bdcSvd().singularValues();
    if (singular_values.minCoeff() < 1e-4 * singular_values.maxCoeff()) continue;
    BOOST_TEST_CONTEXT("seed " << seed) {
      const Factorisation<Complex, 1> factorisation(test::analyse(graph), values);
      hurt += factorisation.accuracy()[0].pivoting ? 1 : 0;
      check_against_dense(graph, values, factorisation, 1e-8);
    }
  }
  BOOST_TEST_MESSAGE(hurt << " of these networks needed pivoting");
}

BOOST_AUTO_TEST_CASE(exactly_cancelling_series_branches_are_reported_and_solved) {
  // Chain 0 - 1 - 2 - 0 closed to a ring with +j0.2 and -j0.2 meeting at row 1: a_11 = 0, Z exists.
  const Graph graph{"ring", 4, {{0, 1}, {1, 2}, {2, 3}, {3, 0}}};
  const auto y = [](double x) { return 1.0 / Complex(0, x); };
  const auto values = network_values(graph, {y(0.2), y(-0.2), y(0.3), y(0.4)}, Complex(0, -5));
  const Factorisation<Complex, 1> factorisation(test::analyse(graph), values);
  BOOST_TEST(factorisation.accuracy()[0].residual <= kTrustedResidual);
  check_against_dense(graph, values, factorisation, 1e-10);
}

BOOST_AUTO_TEST_CASE(nearly_cancelling_pivots_are_refined_or_pivoted) {
  int refined = 0;
  int pivoted = 0;
  for (const double gap : {1e-3, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9, 1e-10, 1e-12}) {
    const Graph graph{"ring", 4, {{0, 1}, {1, 2}, {2, 3}, {3, 0}}};
    const auto y = [](double x) { return 1.0 / Complex(0, x); };
    const auto values =
        network_values(graph, {y(0.2), y(-0.2 * (1 + gap)), y(0.3), y(-0.3 * (1 + gap))}, Complex(0.1, -5));
    BOOST_TEST_CONTEXT("gap " << gap) {
      try {
        const Factorisation<Complex, 1> factorisation(test::analyse(graph), values);
        refined += factorisation.accuracy()[0].refined ? 1 : 0;
        pivoted += factorisation.accuracy()[0].pivoting ? 1 : 0;
        BOOST_TEST(factorisation.accuracy()[0].worst_pivot_ratio >= 1.0);
        const Dense<Complex> a = test::dense_matrix(graph, values, 0);
        const auto singular_values = a.bdcSvd().singularValues();
        const double condition = singular_values.maxCoeff() / singular_values.minCoeff();
        check_against_dense(graph, values, factorisation, std::max(1e-10, 1e-14 * condition));
      } catch (const NumericalError& error) {
        BOOST_TEST(gap <= 1e-10);
      }
    }
  }
  BOOST_TEST_MESSAGE(refined << " refined, " << pivoted << " pivoted");
}

template <typename Matrix>
void check_singular(const Graph& graph, const Matrix& values, const std::set<Index>& rows, int lane) {
  using Scalar = typename decltype(values.diagonal)::value_type::value_type;
  constexpr int kLanes = static_cast<int>(std::tuple_size_v<typename decltype(values.diagonal)::value_type>);
  try {
    const Factorisation<Scalar, kLanes> factorisation(test::analyse(graph), values);
    BOOST_ERROR("no NumericalError for " << graph.name << ", residual "
                                         << factorisation.accuracy()[at(lane)].residual);
  } catch (const NumericalError& error) {
    BOOST_TEST(error.lane() == lane);
    BOOST_TEST(rows.count(error.row()) == 1u, "row " << error.row() << " of " << graph.name);
    BOOST_TEST(std::string(error.what()).find("row " + std::to_string(error.row())) != std::string::npos);
  }
}

BOOST_AUTO_TEST_CASE(an_island_without_earth_throws_and_names_one_of_its_rows) {
  for (unsigned seed = 1; seed <= 30; ++seed) {
    std::mt19937 random(seed);
    // Two islands of 20 and 15 rows; only the first is earthed.
    std::set<std::pair<Index, Index>> pairs;
    for (Index v = 1; v < 20; ++v) pairs.insert({static_cast<Index>(random() % static_cast<unsigned>(v)), v});
    for (Index v = 21; v < 35; ++v)
      pairs.insert({20 + static_cast<Index>(random() % static_cast<unsigned>(v - 20)), v});
    Graph graph{"two islands", 35, {}};
    for (const auto& [a, b] : pairs) graph.edges.push_back({a, b});
    graph.edges.push_back({2, 19});
    graph.edges.push_back({22, 34});
    std::set<std::pair<Index, Index>> unique;
    std::erase_if(graph.edges,
                  [&](const Edge& edge) { return !unique.insert(std::minmax(edge.i, edge.j)).second; });
    std::vector<Complex> admittance;
    std::uniform_real_distribution<double> part(0.1, 3);
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const double r = part(random);
      admittance.push_back(1.0 / Complex(r, part(random)));
    }
    const auto values = network_values(graph, admittance, Complex(0.5, -5));
    std::set<Index> second;
    for (Index v = 20; v < 35; ++v) second.insert(v);
    BOOST_TEST_CONTEXT("seed " << seed) { check_singular(graph, values, second, 0); }
  }
}

BOOST_AUTO_TEST_CASE(small_singular_matrices_throw) {
  check_singular(Graph{"zero", 1, {}}, Values<double, 1>{{{0.0}}, {}}, {0}, 0);
  check_singular(Graph{"branch", 2, {{0, 1}}}, Values<double, 1>{{{1.0}, {1.0}}, {{-1.0}}}, {0, 1}, 0);
  check_singular(Graph{"lane 1", 2, {{0, 1}}}, Values<double, 2>{{{2.0, 0.3}, {2.0, 0.3}}, {{-1.0, -0.3}}},
                 {0, 1}, 1);
  check_singular(Graph{"zero row", 3, {{0, 1}, {1, 2}}},
                 Values<Complex, 1>{{{Complex(1)}, {Complex(2)}, {Complex(0)}}, {{Complex(1)}, {Complex(0)}}},
                 {2}, 0);
}

BOOST_AUTO_TEST_CASE(not_a_number_throws) {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const Graph graph{"pair and single", 3, {{0, 1}}};
  BOOST_CHECK_THROW((Factorisation<double, 1>(test::analyse(graph), {{{1.0}, {1.0}, {nan}}, {{0.5}}})),
                    NumericalError);
  BOOST_CHECK_THROW((Factorisation<double, 1>(test::analyse(graph), {{{1.0}, {1.0}, {1.0}}, {{nan}}})),
                    NumericalError);
}

BOOST_AUTO_TEST_CASE(a_large_impedance_to_earth_needs_no_remedy) {
  // Ring of y = 1000 earthed by 1e-5: |A||z| = 1e8, far above what a mismatch of 1e-9 allows to any solver.
  std::mt19937 random(23);
  const Graph graph = test::finish("ring", 6, {{0, 1}, {1, 2}, {2, 3}, {3, 4}, {4, 5}, {0, 5}}, random);
  const auto values = network_values(graph, std::vector<Complex>(6, Complex(0, -1000)), Complex(0, 1e-5));
  const Factorisation<Complex, 1> factorisation(test::analyse(graph), values);
  BOOST_TEST(!factorisation.accuracy()[0].pivoting);
  BOOST_TEST(!factorisation.accuracy()[0].refined);
  for (const auto& entry : factorisation.selected_inverse().diagonal) {
    BOOST_TEST(test::close<Complex>(entry[0] * 1e-5, Complex(0, -1), 1e-6));
  }
}

/// Factors of one lane with what belongs to them, below the level of Factorisation.
struct PlainFactors {
  PlainFactors(const Graph& graph, const Values<Complex, 1>& values)
      : factors(std::make_shared<const EliminationPlan>(plan_elimination(graph.order, graph.edges))) {
    EliminationWorkspace<Complex> workspace;
    eliminate<Complex, 1>(factors, workspace, values, 1);
  }
  LaneFactors<Complex, 1> factors;
};

BOOST_AUTO_TEST_CASE(sound_factors_are_settled_by_their_spot) {
  std::mt19937 random(29);
  for (const Graph& graph : test::unfriendly_graphs(random)) {
    BOOST_TEST_CONTEXT(graph.name) {
      auto values = test::random_values<Complex, 1>(graph, 1.4, random);
      const PlainFactors plain(graph, values);
      const auto& plan = *plain.factors.plan;
      BOOST_TEST(is_sound(plain.factors, 1));
      ProbeSolver<Complex, 1> solver(plain.factors);
      const auto right = probe_spot<Complex, 1>(solver, plan, values);
      BOOST_TEST(right[0].residual <= 1e-12);
      // The equations of the spot notice a change of any of their coefficients.
      if (plan.spot.terms.empty()) continue;
      values.off_diagonal[at(plan.spot.terms.back().edge)][0] *= 1.01;
      const auto wrong = probe_spot<Complex, 1>(solver, plan, values);
      BOOST_TEST(wrong[0].residual > 1e-12);
    }
  }
}

BOOST_AUTO_TEST_CASE(a_row_that_outgrows_its_diagonal_is_not_sound_though_no_pivot_is_suspect) {
  const Graph graph{"chain", 3, {{0, 1}, {1, 2}}};
  const Values<Complex, 1> values{{{1e-4}, {1e-3}, {1e-4}}, {{1.0}, {1.0}}};
  const PlainFactors plain(graph, values);
  for (const auto& watch : plain.factors.watches) {
    BOOST_TEST(watch.worst[0][0].squared < kSuspectGrowth * kSuspectGrowth);
  }
  BOOST_TEST(!is_sound(plain.factors, 1));
}

BOOST_AUTO_TEST_CASE(factors_that_overflow_are_not_sound) {
  const Graph graph{"pair", 2, {{0, 1}}};
  const Values<Complex, 1> values{{{1e-200}, {1e-200}}, {{1e-200}}};
  BOOST_TEST(!is_sound(PlainFactors(graph, values).factors, 1));
}

BOOST_AUTO_TEST_CASE(the_comparison_of_these_tests_fails_on_not_a_number) {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  BOOST_TEST(!test::close<double>(nan, 1.0, 1e300));
  BOOST_TEST(!test::close<double>(1.0, nan, 1e300));
  BOOST_TEST(!test::close<Complex>(Complex(0, nan), 0, 1e300));
  BOOST_TEST(!test::close<double>(std::numeric_limits<double>::infinity(), 0, 1e300));
}

BOOST_AUTO_TEST_SUITE_END()

}  // namespace
}  // namespace kiloamp::sparse
