// Claims about engine/sparse/analysis.hpp and the plan behind it.
#include <boost/test/unit_test.hpp>
#include <map>
#include <numeric>

#include "engine/sparse/elimination_plan.hpp"
#include "tests/unit/sparse/random_systems.hpp"

namespace kiloamp::sparse {
namespace {

using test::Graph;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

/// Structure of L by eliminating the positions one after the other on sets: the definition.
std::vector<std::set<Index>> fill_by_definition(const Graph& graph, const std::vector<Index>& position_of) {
  std::vector<std::set<Index>> later(at(graph.order));
  for (const Edge& edge : graph.edges) {
    const auto [a, b] = std::minmax(position_of[at(edge.i)], position_of[at(edge.j)]);
    later[at(a)].insert(b);
  }
  for (auto& column : later) {
    if (column.empty()) continue;
    const Index first = *column.begin();
    for (const Index row : column) {
      if (row != first) later[at(first)].insert(row);
    }
  }
  return later;
}

void check_plan(const Graph& graph) {
  const EliminationPlan plan = plan_elimination(graph.order, graph.edges);
  std::vector<Index> sorted = plan.position_of;
  std::sort(sorted.begin(), sorted.end());
  for (Index p = 0; p < graph.order; ++p) {
    BOOST_REQUIRE(sorted[at(p)] == p);
    BOOST_REQUIRE(plan.position_of[at(plan.row_of[at(p)])] == p);
  }
  const auto expected = fill_by_definition(graph, plan.position_of);
  for (Index p = 0; p < graph.order; ++p) {
    std::vector<Index> rows(plan.rows.begin() + plan.column_begin[at(p)],
                            plan.rows.begin() + plan.diagonal_slot(p));
    BOOST_REQUIRE(std::is_sorted(rows.rbegin(), rows.rend()));
    const std::set<Index> found(rows.begin(), rows.end());
    BOOST_REQUIRE(found.size() == rows.size());
    BOOST_REQUIRE(std::includes(found.begin(), found.end(), expected[at(p)].begin(), expected[at(p)].end()));
    BOOST_REQUIRE(plan.rows[at(plan.diagonal_slot(p))] == p);
    // What is stored beyond the definition still has to be closed: the rows of a column are joined pairwise.
    for (std::size_t x = 0; x < rows.size(); ++x) {
      for (std::size_t y = x + 1; y < rows.size(); ++y) {
        const Index slot = plan.find_slot(rows[y], rows[x]);
        BOOST_REQUIRE(slot < plan.column_begin[at(rows[y]) + 1]);
        BOOST_REQUIRE(plan.rows[at(slot)] == rows[x]);
      }
    }
  }
}

BOOST_AUTO_TEST_SUITE(analysis)

BOOST_AUTO_TEST_CASE(structure_of_l_contains_the_fill_and_is_closed) {
  for (unsigned seed = 1; seed <= 40; ++seed) {
    std::mt19937 random(seed);
    for (const Graph& graph : test::unfriendly_graphs(random)) {
      BOOST_TEST_CONTEXT("seed " << seed << ", " << graph.name) { check_plan(graph); }
    }
  }
}

BOOST_AUTO_TEST_CASE(every_entry_of_a_has_a_slot_and_every_other_slot_is_fill) {
  std::mt19937 random(7);
  for (const Graph& graph : test::unfriendly_graphs(random)) {
    const EliminationPlan plan = plan_elimination(graph.order, graph.edges);
    std::vector<int> seen(at(plan.slots()), 0);
    for (const auto* slots : {&plan.edge_slot, &plan.row_slot, &plan.fill_slots}) {
      for (const Index slot : *slots) ++seen[at(slot)];
    }
    BOOST_TEST(std::all_of(seen.begin(), seen.end(), [](int count) { return count == 1; }), graph.name);
    bool in_column = true;
    for (std::size_t e = 0; e < graph.edges.size(); ++e) {
      const Index p = plan.edge_column[e];
      in_column = in_column && plan.edge_slot[e] >= plan.column_begin[at(p)] &&
                  plan.edge_slot[e] < plan.diagonal_slot(p);
    }
    BOOST_TEST(in_column, graph.name);
  }
}

BOOST_AUTO_TEST_CASE(tasks_own_disjoint_steps_and_cover_all_columns) {
  std::mt19937 random(3);
  const Graph graph = test::large_graph(120, random);
  const EliminationPlan plan = plan_elimination(graph.order, graph.edges);
  BOOST_REQUIRE(plan.tasks > 1);
  std::vector<int> owned(at(graph.order), 0);
  for (Index task = 0; task <= plan.tasks; ++task) {
    for (const Index s : plan.steps_of(task)) {
      for (Index c = 0; c < plan.steps[at(s)].columns; ++c) ++owned[at(plan.steps[at(s)].first + c)];
    }
  }
  BOOST_TEST(std::all_of(owned.begin(), owned.end(), [](int count) { return count == 1; }));
  // A column of a task is updated by columns of that task only.
  std::vector<Index> task_of(at(graph.order));
  for (Index task = 0; task <= plan.tasks; ++task) {
    for (const Index s : plan.steps_of(task)) {
      for (Index c = 0; c < plan.steps[at(s)].columns; ++c) task_of[at(plan.steps[at(s)].first + c)] = task;
    }
  }
  for (Index p = 0; p < graph.order; ++p) {
    for (Index slot = plan.column_begin[at(p)]; slot < plan.diagonal_slot(p); ++slot) {
      const Index above = task_of[at(plan.rows[at(slot)])];
      BOOST_REQUIRE((above == task_of[at(p)] || above == plan.tasks));
    }
  }
}

BOOST_AUTO_TEST_CASE(trees_have_no_fill) {
  std::mt19937 random(11);
  std::set<std::pair<Index, Index>> pairs;
  for (Index v = 1; v < 500; ++v) pairs.insert({static_cast<Index>(random() % static_cast<unsigned>(v)), v});
  const Graph tree = test::finish("tree", 500, pairs, random);
  BOOST_TEST(test::analyse(tree)->factor_entries() == 500u + 499u);
}

BOOST_AUTO_TEST_CASE(chains_of_a_million_rows_stay_shallow) {
  std::vector<Edge> edges;
  for (Index v = 1; v < 1'000'000; ++v) edges.push_back({v - 1, v});
  const Analysis line(1'000'000, edges);
  BOOST_TEST(line.factor_entries() == 1'999'999u);
  edges.push_back({999'999, 0});
  const Analysis ring(1'000'000, edges);
  // Each round takes at least every third row of a ring, so the tree has at most log(n) / log(1.5) = 34
  // rounds, and a column spans at most two of them.
  BOOST_TEST(ring.tree_height() <= 68);
  BOOST_TEST(ring.factor_entries() <= 3'000'000u);
}

BOOST_AUTO_TEST_CASE(hubs_are_linear_in_time_and_fill) {
  std::vector<Edge> star, bundle;
  for (Index v = 1; v < 300'000; ++v) star.push_back({0, v});
  BOOST_TEST(Analysis(300'000, star).factor_entries() == 599'999u);
  for (Index v = 2; v < 100'000; ++v) {
    bundle.push_back({0, v});
    bundle.push_back({1, v});
  }
  BOOST_TEST(Analysis(100'000, bundle).factor_entries() <= 3u * 100'000u + 100u);
}

BOOST_AUTO_TEST_SUITE_END()

}  // namespace
}  // namespace kiloamp::sparse
