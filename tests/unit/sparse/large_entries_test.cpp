// Claims about engine/sparse/large_entries.hpp against whole columns.
#include <boost/test/unit_test.hpp>
#include <map>

#include "tests/unit/sparse/random_systems.hpp"

namespace kiloamp::sparse {
namespace {

using Complex = std::complex<double>;

BOOST_AUTO_TEST_SUITE(large_entries)

BOOST_AUTO_TEST_CASE(exactly_the_large_entries_of_each_column_are_found) {
  std::mt19937 random(4711);
  std::size_t found_all = 0, entries = 0;
  auto graphs = test::unfriendly_graphs(random);
  graphs.push_back(test::large_graph(12, random));
  for (const test::Graph& graph : graphs) {
    if (graph.order == 0) continue;
    const auto values = test::random_values<Complex, 3>(graph, 1.3, random);
    const Factorisation<Complex, 3> factorisation(test::analyse(graph), values);
    std::vector<double> floor(static_cast<std::size_t>(graph.order));
    for (double& one : floor) one = 0.5 + static_cast<double>(random() % 100) / 100;
    std::vector<std::array<Complex, 3>> column(floor.size());
    for (const int lane : {0, 1, 2}) {
      BOOST_REQUIRE((!factorisation.accuracy()[static_cast<std::size_t>(lane)].refined));
      LargeEntries<Complex, 3> finder(factorisation.plain_factors(), lane, floor);
      for (Index j = 0; j < graph.order; j += 1 + graph.order / 8) {
        factorisation.column(j, column);
        const double peak = std::abs(column[static_cast<std::size_t>(j)][static_cast<std::size_t>(lane)]);
        for (const double part : {0.0, 1e-6, 1e-2, 0.3}) {
          const double threshold = part * peak;
          std::map<Index, Complex> found;
          finder.column(j, threshold, [&](Index k, Complex z) { found[k] = z; });
          std::size_t expected = 0;
          for (std::size_t k = 0; k < column.size(); ++k) {
            const Complex z = column[k][static_cast<std::size_t>(lane)];
            const auto place = found.find(static_cast<Index>(k));
            // At the threshold itself rounding decides.
            if (std::abs(z) > threshold * floor[k] * (1 + 1e-9) && std::abs(z) > 0) {
              ++expected;
              BOOST_TEST((place != found.end()), graph.name << ", column " << j << ", row " << k);
            }
            if (place != found.end()) BOOST_TEST(test::close<Complex>(place->second, z, 1e-11 * peak));
          }
          BOOST_TEST(found.size() <= expected + 1);
          found_all += found.size();
          entries += column.size();
        }
      }
    }
  }
  BOOST_TEST(found_all < entries);
}

BOOST_AUTO_TEST_SUITE_END()

}  // namespace
}  // namespace kiloamp::sparse
