// Vector groups after IEC 60076-1 (symbols and clock numbers from memory).
#include <boost/test/unit_test.hpp>

#include "engine/network/branches.hpp"

using namespace kiloamp;

BOOST_AUTO_TEST_SUITE(vector_group)

BOOST_AUTO_TEST_CASE(common_groups_are_read) {
  const auto dyn11 = parse_vector_group("Dyn11");
  BOOST_REQUIRE(dyn11);
  BOOST_TEST((dyn11->hv == Winding::delta));
  BOOST_TEST((dyn11->lower == std::vector<ClockedWinding>{{Winding::star_neutral, 11}}));
  const auto three = parse_vector_group("YNynd5");
  BOOST_TEST(!three.has_value());  // the middle winding lacks its number
  const auto full = parse_vector_group("YNyn0d5");
  BOOST_REQUIRE(full);
  BOOST_TEST((full->lower == std::vector<ClockedWinding>{{Winding::star_neutral, 0}, {Winding::delta, 5}}));
  const auto autotransformer = parse_vector_group("YNad11");
  BOOST_REQUIRE(autotransformer);
  BOOST_TEST(autotransformer->auto_symbol);
  BOOST_TEST((parse_vector_group("YNa0d11")->lower == autotransformer->lower));
}

// Star against delta or zigzag turns by an odd number, everything else by an even one.
BOOST_AUTO_TEST_CASE(only_clock_numbers_that_exist_are_taken) {
  int taken = 0;
  for (const char* hv : {"D", "Y", "YN", "Z", "ZN"}) {
    for (const char* lv : {"d", "y", "yn", "z", "zn"}) {
      for (int clock = 0; clock < 14; ++clock) {
        const bool odd = (hv[0] == 'Y') != (lv[0] == 'y');
        const bool expected = clock < 12 && (clock % 2 == 1) == odd;
        const bool got = parse_vector_group(hv + std::string(lv) + std::to_string(clock)).has_value();
        BOOST_TEST(got == expected, hv << lv << clock);
        taken += got ? 1 : 0;
      }
    }
  }
  BOOST_TEST(taken == 25 * 6);
}

BOOST_AUTO_TEST_CASE(what_is_no_group_is_refused) {
  for (const char* text : {"", "D", "d11", "Dyn", "Dyn012", "Dyn 11", "DYN11", "Xyn0", "Dyn11x", "YNyn0d5d5",
                           "Da0", "YNa6", "YNyn00"})
    BOOST_TEST(!parse_vector_group(text).has_value(), text);
}

BOOST_AUTO_TEST_SUITE_END()
