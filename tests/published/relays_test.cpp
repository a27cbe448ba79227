// Published values of what a distance relay measures.
#include "engine/study/relays.hpp"
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(relays_published)

// Source: Horowitz & Phadke, Power System Relaying, example 5.3 (from memory): lines A-tap 4 + j40 and tap-B
// 4 + j40 ohm, tap-C 2 + j20; infeed from C half of the current from A. Apparent impedance at A for a fault
// at B: (4 + j40) + 1.5 (4 + j40) = 10 + j100. Sources chosen here so that the infeed is a half: 1 + j10
// behind A (5 + j50 to the tap), 8 + j80 behind C (10 + j100).
BOOST_AUTO_TEST_CASE(infeed_at_a_tee_matches_horowitz_phadke_ex_5_3) {
  const Network n = read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":60,
    "buses":[{"id":"A","nominal_kv":138},{"id":"TAP","nominal_kv":138},{"id":"B","nominal_kv":138},{"id":"C","nominal_kv":138}],
    "network_feeders":[{"id":"SA","bus":"A","max":{"r1_ohm":1,"x1_ohm":10,"r0_ohm":1,"x0_ohm":10}},
                       {"id":"SC","bus":"C","max":{"r1_ohm":8,"x1_ohm":80,"r0_ohm":8,"x0_ohm":80}}],
    "lines":[
      {"id":"A-TAP","from":"A","to":"TAP","kind":"overhead","length_km":1,"r1_ohm_per_km":4,"x1_ohm_per_km":40,"r0_ohm_per_km":12,"x0_ohm_per_km":120},
      {"id":"TAP-B","from":"TAP","to":"B","kind":"overhead","length_km":1,"r1_ohm_per_km":4,"x1_ohm_per_km":40,"r0_ohm_per_km":12,"x0_ohm_per_km":120},
      {"id":"TAP-C","from":"TAP","to":"C","kind":"overhead","length_km":1,"r1_ohm_per_km":2,"x1_ohm_per_km":20,"r0_ohm_per_km":6,"x0_ohm_per_km":60}],
    "relays":[{"id":"R","bus":"A","branch":"A-TAP","ct_ratio":[600,5],"vt_ratio":[138000,115],
      "elements":[{"function":"phase_overcurrent","pickup_a":5,"curve":"iec_a","time_multiplier":0.2}]}]})");
  const RelayStudy study(n, {});
  BOOST_REQUIRE(study.locations().list.size() == 1U);
  BOOST_TEST(*study.locations().list[0].ct_ratio == 120);
  std::vector<RelayRow> rows;
  const auto workspace = study.make_workspace();
  study.at_location(0, *workspace, rows);
  std::size_t seen = 0;
  for (const RelayRow& row : rows) {
    if (row.state.kind != RelayStateKind::intact || n.bus(row.place_bus).id != "B") continue;
    ++seen;
    constexpr double kExact = 1e-9;
    if (row.kind == FaultKind::three_phase || row.kind == FaultKind::line_to_line) {
      BOOST_TEST(near(*row.loops.bc, {10, 100}, kExact * 100));
      BOOST_TEST(std::abs(*row.infeed_factor - 1.5) < kExact);
    }
    // Zero sequence has the same proportions (three times every impedance but the sources'), so that the
    // earth loop sees more than the line by the infeed too; its share is not the book's.
    BOOST_TEST((row.direction == Direction::forward));
  }
  BOOST_TEST(seen == 4U);
}

// k0 = (Z0 - Z1) / (3 Z1): Z0 = 3 Z1 gives 2/3.
BOOST_AUTO_TEST_CASE(residual_compensation_of_a_line) {
  BOOST_TEST(near(residual_compensation({4, 40}, {12, 120}), 2.0 / 3.0, 1e-12));
}

BOOST_AUTO_TEST_SUITE_END()
