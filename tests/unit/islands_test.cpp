// Islands, ratios around loops, and phase shifts around loops.
#include "engine/sequence/islands.hpp"

#include <boost/test/unit_test.hpp>

using namespace kiloamp;
using kiloamp::detail::Islands;
using kiloamp::detail::lag_clocks;
using kiloamp::detail::Link;

BOOST_AUTO_TEST_SUITE(islands)

namespace {
Node node(int n) { return static_cast<Node>(n); }

Network transformers(std::initializer_list<const char*> groups) {
  Network network;
  for (const char* group : groups) {
    Transformer t;
    t.id = "T" + std::to_string(network.transformers.size() + 1);
    t.vector_group = *parse_vector_group(group);
    network.transformers.push_back(t);
  }
  return network;
}
}  // namespace

BOOST_AUTO_TEST_CASE(a_mark_reaches_the_whole_island_in_any_order) {
  Islands islands(6);
  islands.join(node(0), node(1));
  islands.mark(node(1));
  islands.join(node(2), node(0));
  islands.join(node(3), node(4));
  for (int n = 0; n < 3; ++n) BOOST_TEST(islands.is_marked(node(n)));
  for (int n = 3; n < 6; ++n) BOOST_TEST(!islands.is_marked(node(n)));
  BOOST_TEST(islands.unmarked_representatives().size() == 2);
}

BOOST_AUTO_TEST_CASE(ratios_that_close_are_no_path_and_ratios_that_do_not_are_one) {
  Islands closing(3), open(3);
  closing.join(node(0), node(1), 0.5);
  closing.join(node(1), node(2), 4.0);
  closing.join(node(2), node(0), 0.5);
  BOOST_TEST(!closing.is_marked(node(0)));
  open.join(node(0), node(1), 0.5);
  open.join(node(1), node(2), 4.0);
  open.join(node(2), node(0), 0.55);
  BOOST_TEST(open.is_marked(node(2)));
}

BOOST_AUTO_TEST_CASE(long_chain_of_ratios_stays_exact_enough) {
  constexpr int kNodes = 10000;
  Islands chain(kNodes);
  for (int n = 1; n < kNodes; ++n) chain.join(node(n - 1), node(n), n % 2 == 1 ? 1.05 : 1 / 1.05);
  chain.join(node(kNodes - 1), node(0), 1 / 1.05);
  BOOST_TEST(!chain.is_marked(node(0)));
}

BOOST_AUTO_TEST_CASE(lags_add_up_along_a_chain) {
  const Network network = transformers({"Dyn11", "Dyn1"});
  const auto lag = lag_clocks(network, 3,
                              {Link{node(0), node(1), 11, {ElementKind::transformer, 0}},
                               Link{node(1), node(2), 1, {ElementKind::transformer, 1}}});
  BOOST_TEST(lag[0] == 0);
  BOOST_TEST(lag[1] == 11);
  BOOST_TEST(lag[2] == 0);
}

BOOST_AUTO_TEST_CASE(a_loop_that_does_not_close_is_named) {
  const Network network = transformers({"Dyn11", "Dyn1"});
  const std::vector<Link> links{{node(0), node(1), 11, {ElementKind::transformer, 0}},
                                {node(0), node(1), 1, {ElementKind::transformer, 1}}};
  try {
    (void)lag_clocks(network, 2, links);
    BOOST_ERROR("the loop went unseen");
  } catch (const NetworkError& error) {
    BOOST_REQUIRE(error.findings().size() == 1);
    const std::string& found = error.findings().front().found;
    BOOST_TEST(found.find("\"T1\" Dyn11") != std::string::npos, found);
    BOOST_TEST(found.find("\"T2\" Dyn1") != std::string::npos, found);
  }
}

BOOST_AUTO_TEST_SUITE_END()
