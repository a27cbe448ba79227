// Where a duty study could err to the unsafe side: worked by hand.
#include <cmath>

#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(duty_safe_side)

namespace {

constexpr double kFiveDigits = 2e-5;  // relative: the hand values have six digits

Network bus_b(double hz, double kv, const std::string& rest) {
  return read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":)" + std::to_string(hz) +
                   R"(,"buses":[{"id":"B","nominal_kv":)" + std::to_string(kv) + "}]," + rest + "}");
}
const DutyCheck& check_of(const DutyTable& table, DutyQuantity quantity, std::size_t device = 0) {
  for (const DutyCheck& c : table.devices.at(device).checks)
    if (c.quantity == quantity) return c;
  throw std::logic_error("no such check");
}
bool within(double value, double expected, double relative = kFiveDigits) {
  return std::abs(value - expected) <= relative * std::abs(expected);
}

// Two sources on one bus, the first with little resistance, a device on the second: beyond it only the first
// flows.
std::string two_feeders(const std::string& first, const std::string& device) {
  return R"("network_feeders":[{"id":"F1","bus":"B","max":)" + first +
         R"(},{"id":"F2","bus":"B","max":{"r1_ohm":0.5,"x1_ohm":0.3}}],"breakers":[{"id":"D","bus":"B","branch":"F2",)" +
         device + "}]";
}

}  // namespace

// F1 0.01 + j0.5 ohm at 11 kV, c 1.1: 13.9691 kA, R/X 0.02, kappa = 1.02 + 0.98 e^-0.06 = 1.942929, ip
// = 38.3831 kA; the mixture at the bus has a kappa near 1.6. 55 ms after the start its dc is e^(-2 pi 50 x
// 0.055 x 0.02) = 70.7813 %.
BOOST_AUTO_TEST_CASE(peak_and_dc_of_a_part_are_its_own_where_they_are_larger) {
  const auto t =
      duty(bus_b(50, 11, two_feeders(R"({"r1_ohm":0.01,"x1_ohm":0.5})", R"("standard":"iec62271-100",
    "rated_kv":12,"breaking_ka":14,"making_peak_ka":36,"short_time_ka":25,"short_time_s":3,"opening_time_s":0.045)")),
           {});
  const DutyCheck& peak = check_of(t, DutyQuantity::making_peak);
  BOOST_TEST((peak.side == DutySide::beyond));
  BOOST_TEST(within(peak.through_ka, 13.9691));
  BOOST_TEST(within(peak.duty, 38.3831));
  BOOST_TEST((peak.verdict == Verdict::over));
  const DutyCheck& dc = check_of(t, DutyQuantity::dc_component);
  BOOST_TEST(within(dc.duty, 70.7813));
  BOOST_TEST((dc.verdict == Verdict::over));
}

// F1 0.4/60 + j0.4 ohm at 13.8 kV: 19.9158 kA, X/R 60; parting at 3 cycles: sqrt(1 + 2 e^(-12 pi/60)) / 1.1
// = 1.306998; duty 26.0299 kA.
BOOST_AUTO_TEST_CASE(asymmetry_of_a_part_is_its_own_where_it_is_larger) {
  const auto t = duty(
      bus_b(60, 13.8, two_feeders(R"({"r1_ohm":0.006666666667,"x1_ohm":0.4})", R"("standard":"c37-k-factor",
    "rated_kv":15,"k_factor":1.3,"interrupting_ka":24,"interrupting_time_cycles":5)")),
      {});
  const DutyCheck& c = check_of(t, DutyQuantity::breaking);
  BOOST_TEST((c.side == DutySide::beyond));
  BOOST_TEST(within(c.through_ka, 19.9158));
  BOOST_TEST(within(*c.x_over_r, 60, 1e-6));
  BOOST_TEST(within(c.duty, 26.0299));
}

// A percentage above the rated stays undecided whatever another state asks.
BOOST_AUTO_TEST_CASE(another_state_does_not_decide_an_undecided_dc_component) {
  const std::string device =
      R"("breakers":[{"id":"D","bus":"B","standard":"iec62271-100","rated_kv":12,"breaking_ka":25,
    "making_peak_ka":80,"short_time_ka":25,"short_time_s":3,"opening_time_s":0.045}])";
  const std::string feeders = R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.005,"x1_ohm":0.5}},
    {"id":"G","bus":"B","in_service":false,"max":{"r1_ohm":0.33,"x1_ohm":0.03}}],)";
  const auto alone = duty(bus_b(50, 11, feeders + device), {});
  BOOST_TEST((check_of(alone, DutyQuantity::dc_component).verdict == Verdict::not_evaluated));
  const auto both =
      duty(bus_b(50, 11, feeders + R"("scenarios":[{"id":"S","out":["F"],"in":["G"]}],)" + device), {});
  const DutyCheck& c = check_of(both, DutyQuantity::dc_component);
  BOOST_TEST((c.verdict == Verdict::not_evaluated));
  BOOST_TEST(c.state == 0U);
  BOOST_TEST(c.why.find("ask the maker") != std::string::npos);
}

// One generator, Ra so small that the dc is nearly whole: X"d 15 %, Ra 0.05 %: its current does not cross
// zero when mu has taken a fifth of the ac.
BOOST_AUTO_TEST_CASE(missing_current_zeros_are_not_a_pass) {
  const auto t =
      duty(bus_b(50, 11, R"("synchronous_machines":[{"id":"G","bus":"B","role":"generator","rated_mva":50,
    "rated_kv":11,"power_factor":0.85,"xd_subtransient_percent":15,"ra_percent":0.05}],
    "breakers":[{"id":"D","bus":"B","standard":"iec62271-100","rated_kv":12,"breaking_ka":63,"making_peak_ka":160,
    "short_time_ka":63,"short_time_s":3,"opening_time_s":0.045,"dc_time_constant_ms":133}])"),
           {});
  const DutyCheck& c = check_of(t, DutyQuantity::dc_component);
  BOOST_TEST((c.verdict == Verdict::not_evaluated));
  BOOST_TEST(c.duty > 100);
  BOOST_TEST(c.why.find("does not cross zero") != std::string::npos);
}

// F feeds B1, both couplers closed: 11 x 1.1 /sqrt(3) / 0.5 = 13.9720 kA through the last to open, not half
// of it.
BOOST_AUTO_TEST_CASE(one_of_two_closed_couplers_carries_the_whole_current) {
  const Network n = read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":50,
    "buses":[{"id":"B","nominal_kv":11},{"id":"C","nominal_kv":11}],
    "network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0,"x1_ohm":0.5}}],
    "switches":[{"id":"S1","from":"B","to":"C","closed":true},{"id":"S2","from":"B","to":"C","closed":true}],
    "breakers":[{"id":"D","bus":"B","branch":"S1","standard":"iec62271-103","rated_kv":12,"making_peak_ka":100,
      "short_time_ka":25,"short_time_s":1}]})");
  const DutyTable t = duty(n, {});
  const DutyCheck& c = check_of(t, DutyQuantity::short_time);
  BOOST_TEST(within(c.through_ka, 13.9720));
  BOOST_TEST(c.note.find("one of several closed ways") != std::string::npos);
}

// A coupler alone: from B's side F flows, from C's side G.
BOOST_AUTO_TEST_CASE(a_coupler_carries_what_lies_on_either_side) {
  const Network n = read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":60,
    "buses":[{"id":"B","nominal_kv":13.8},{"id":"C","nominal_kv":13.8}],
    "network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.01,"x1_ohm":0.4}},{"id":"G","bus":"C","max":{"r1_ohm":0.02,"x1_ohm":0.8}}],
    "switches":[{"id":"S","from":"B","to":"C","closed":true}],
    "breakers":[{"id":"D","bus":"C","branch":"S","standard":"c37-constant-ka","rated_kv":15,"interrupting_ka":40,
      "interrupting_time_cycles":5}]})");
  const DutyTable t = duty(n, {});
  // At C: own = F's 13.8/sqrt(3)/0.400125 = 19.9124; the larger of it and G's 9.9562.
  BOOST_TEST(within(check_of(t, DutyQuantity::breaking).through_ka, 19.9124));
  BOOST_TEST((check_of(t, DutyQuantity::breaking).side == DutySide::own));
}

BOOST_AUTO_TEST_CASE(a_device_that_a_scenario_puts_in_is_judged) {
  const std::string text = R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.002,"x1_ohm":0.01}}],
    "breakers":[{"id":"D","bus":"B","in_service":false,"standard":"ul489","rated_kv":0.48,"interrupting_ka":10}])";
  const auto never = duty(bus_b(60, 0.48, text), {});
  BOOST_TEST(never.devices.empty());
  BOOST_TEST(never.warnings.front() == "breaker D out of service in every state: not judged");
  const auto spare = duty(bus_b(60, 0.48, text + R"(,"scenarios":[{"id":"spare","in":["D"]}])"), {});
  BOOST_REQUIRE(spare.devices.size() == 1U);
  BOOST_TEST((spare.devices[0].verdict == Verdict::over));
  BOOST_TEST(check_of(spare, DutyQuantity::breaking).state == 1U);
}

BOOST_AUTO_TEST_CASE(operating_voltage_above_the_rated_is_no_pass) {
  DutyOptions options;
  options.study.prefault = PrefaultValue{1.1};
  const auto t =
      duty(bus_b(60, 13.8, R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.02,"x1_ohm":0.8}}],
    "breakers":[{"id":"D","bus":"B","standard":"c37-constant-ka","rated_kv":15,"interrupting_ka":40,
      "interrupting_time_cycles":5}])"),
           options);
  BOOST_TEST(check_of(t, DutyQuantity::breaking).why == "operating voltage 15.18 kV above rated_kv");
  BOOST_TEST((t.devices[0].verdict == Verdict::not_evaluated));
}

// A motor behind a converter feeds nothing; its breaker must still clear the bus's current.
BOOST_AUTO_TEST_CASE(a_breaker_before_a_load_without_current_of_its_own_carries_the_bus_total) {
  const auto t =
      duty(bus_b(50, 0.4, R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.004,"x1_ohm":0.012}}],
    "induction_motors":[{"id":"M","bus":"B","rated_kw":100,"rated_kv":0.4,"power_factor":0.86,"efficiency_percent":95,
      "converter_fed":true}],
    "breakers":[{"id":"D","bus":"B","branch":"M","standard":"iec60947-2","rated_kv":0.415,"icu_ka":25,"ics_ka":25,
      "instantaneous_trip":true}])"),
           {});
  // 0.44/sqrt(3)/0.0126491 = 20.0832 kA.
  BOOST_TEST(within(check_of(t, DutyQuantity::breaking).through_ka, 20.0832));
  BOOST_TEST((t.devices[0].verdict == Verdict::within));
}

// What the headroom allows brings the device to its rating and no further.
BOOST_AUTO_TEST_CASE(headroom_is_what_may_be_added) {
  const std::string fuse =
      R"(,"fuses":[{"id":"D","bus":"B","standard":"iec60282-1","rated_kv":12,"breaking_ka":20}])";
  const auto with = [&](const std::string& zero, double added_mva) {
    std::string more;
    if (added_mva > 0)
      more = R"(,{"id":"N","bus":"B","max":{"three_phase_mva":)" + std::to_string(added_mva) +
             R"(,"x_over_r":10,"voltage_factor":1.1}})";
    return duty(bus_b(50, 11,
                      R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.05,"x1_ohm":0.5)" + zero +
                          "}}" + more + "]" + fuse),
                {});
  };
  // Three-phase governs: 13.9025 kA, so that sqrt(3) 11 (20 - 13.9025) = 116.172 MVA bring it to 20 kA.
  const double three_phase = *with("", 0).devices[0].headroom_mva;
  BOOST_TEST(within(three_phase, 116.172));
  BOOST_TEST(within(check_of(with("", three_phase), DutyQuantity::breaking).duty, 20, 1e-6));
  // Line to ground governs: Z0 a fifth of Z1.
  const std::string zero = R"(,"r0_ohm":0.01,"x0_ohm":0.1)";
  const auto before = with(zero, 0);
  BOOST_TEST((check_of(before, DutyQuantity::breaking).kind != FaultKind::three_phase));
  const auto after = with(zero, *before.devices[0].headroom_mva);
  BOOST_TEST(*before.devices[0].headroom_mva < three_phase);
  BOOST_TEST(check_of(after, DutyQuantity::breaking).duty <= 20 * (1 + 1e-9));
}

// Triangle A B C of lines of 1 ohm, F1 of 1 ohm at A, F2 of 2 ohm at B, fault at C, one angle throughout.
// Nodal equations with C at no voltage, [3 -1; -1 2.5] V = I: F1 alone V = (2.5, 1)/6.5, F2 alone V =
// (0.5, 1.5)/6.5. Through A-C flows V_A: F1 2.5, F2 0.5, shares 5/6 and 1/6; through B-C V_B: F1 1, F2 1.5,
// shares 2/5 and 3/5; at the bus 7/11 and 4/11.
BOOST_AUTO_TEST_CASE(sources_of_a_meshed_network_by_superposition) {
  const auto with = [](const std::string& place) {
    return duty(read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":60,
      "buses":[{"id":"A","nominal_kv":13.8},{"id":"B","nominal_kv":13.8},{"id":"C","nominal_kv":13.8}],
      "network_feeders":[{"id":"F1","bus":"A","max":{"r1_ohm":0.1,"x1_ohm":1}},{"id":"F2","bus":"B","max":{"r1_ohm":0.2,"x1_ohm":2}}],
      "lines":[{"id":"AC","from":"A","to":"C","length_km":1,"r1_ohm_per_km":0.1,"x1_ohm_per_km":1},
               {"id":"BC","from":"B","to":"C","length_km":1,"r1_ohm_per_km":0.1,"x1_ohm_per_km":1},
               {"id":"AB","from":"A","to":"B","length_km":1,"r1_ohm_per_km":0.1,"x1_ohm_per_km":1}],
      "breakers":[{"id":"D","bus":"C",)" +
                          place + R"("standard":"c37-constant-ka","rated_kv":15,"interrupting_ka":40,
        "interrupting_time_cycles":5}]})"),
                {});
  };
  const auto shares = [](const DutyTable& t) {
    const auto& feeds = t.devices.at(0).feeds;
    BOOST_REQUIRE(feeds.size() == 2U);
    return std::array{feeds[0].share, feeds[1].share};
  };
  const DutyTable total = with(""), at_ac = with(R"("branch":"AC",)");
  BOOST_TEST(within(shares(total)[0], 7.0 / 11, 1e-9));
  BOOST_TEST(within(shares(total)[1], 4.0 / 11, 1e-9));
  const auto& governing = at_ac.devices.at(0).checks.at(*at_ac.devices.at(0).governing);
  BOOST_TEST((governing.side == DutySide::own));  // 3/6.5 against 2.5/6.5 of the others
  BOOST_TEST(within(shares(at_ac)[0], 5.0 / 6, 1e-9));
  BOOST_TEST(within(shares(at_ac)[1], 1.0 / 6, 1e-9));
}

// Motors below 50 hp have died away when contacts part: none of the interrupting current is theirs.
BOOST_AUTO_TEST_CASE(sources_of_an_interrupting_duty_are_those_of_the_interrupting_network) {
  const auto t =
      duty(bus_b(60, 13.8, R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.1,"x1_ohm":2}}],
    "induction_motors":[{"id":"M","bus":"B","count":400,"rated_hp":45,"power_factor":0.85,"efficiency_percent":92,
      "rated_kv":13.8,"pole_pairs":2}],
    "breakers":[{"id":"D","bus":"B","standard":"c37-constant-ka","rated_kv":15,"interrupting_ka":4.1,
      "interrupting_time_cycles":5,"close_latch_peak_ka":100}])"),
           {});
  const DeviceDuty& d = t.devices.at(0);
  BOOST_TEST((d.checks.at(*d.governing).quantity == DutyQuantity::breaking));
  BOOST_REQUIRE(d.feeds.size() == 1U);
  BOOST_TEST((d.feeds[0].source == ElementRef{ElementKind::network_feeder, 0}));
}

namespace {

// NACD at a bus of a case with a generator G of 100 MVA, X"d 20 % on 13.8 kV (0.38088 ohm) and a feeder.
double nacd_at(const std::string& bus, const std::string& text) {
  StudyOptions options;
  options.method = Method::c37;
  const CaseStudy study(read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":60,)" + text + "}"),
                        options);
  return study.study().c37()->nacd(study.bus(bus));
}
const std::string kGenerator =
    R"("synchronous_machines":[{"id":"G","bus":"A","role":"generator","rated_mva":100,"rated_kv":13.8,
      "xd_subtransient_percent":20,"ra_percent":0}])";

}  // namespace

// The rule of C37.010: local with more than 0.4 of the terminal value and at most one transformer between.
BOOST_AUTO_TEST_CASE(nacd_by_hand) {
  // On one bus with a feeder of the same reactance half the current is remote.
  BOOST_TEST(within(nacd_at("A", R"("buses":[{"id":"A","nominal_kv":13.8}],
    "network_feeders":[{"id":"F","bus":"A","max":{"r1_ohm":0,"x1_ohm":0.38088}}],)" +
                                     kGenerator),
                    0.5, 1e-9));
  // Behind a reactor of 1.4 X"d the generator alone feeds the fault with 1/2.4 = 0.417 of its terminal value:
  // local; of 1.6 X"d with 0.385: remote.
  const auto behind = [](double times) {
    return nacd_at("B", R"("buses":[{"id":"A","nominal_kv":13.8},{"id":"B","nominal_kv":13.8}],
      "series_reactors":[{"id":"X","from":"A","to":"B","x_ohm":)" +
                            std::to_string(times * 0.38088) + "}]," + kGenerator);
  };
  BOOST_TEST(behind(1.4) < 1e-9);
  BOOST_TEST(within(behind(1.6), 1, 1e-9));
  // Two transformers of 5 % between: 0.667 of the terminal value, but remote by their number; with one local.
  const auto through = [](const std::string& bus) {
    return nacd_at(
        bus,
        R"("buses":[{"id":"A","nominal_kv":13.8},{"id":"H","nominal_kv":69},{"id":"L","nominal_kv":13.8}],
      "transformers":[
        {"id":"T1","hv_bus":"H","lv_bus":"A","rated_mva":100,"hv_kv":69,"lv_kv":13.8,"z_percent":5,"r_percent":0,"vector_group":"Yd1"},
        {"id":"T2","hv_bus":"H","lv_bus":"L","rated_mva":100,"hv_kv":69,"lv_kv":13.8,"z_percent":5,"r_percent":0,"vector_group":"Yd1"}],)" +
            kGenerator);
  };
  BOOST_TEST(through("H") < 1e-9);
  BOOST_TEST(within(through("L"), 1, 1e-9));
}

BOOST_AUTO_TEST_CASE(assumptions_on_motors_are_listed) {
  const auto t =
      duty(bus_b(60, 4.16, R"("network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.01,"x1_ohm":0.2}}],
    "induction_motors":[{"id":"M","bus":"B","rated_hp":900,"power_factor":0.85,"efficiency_percent":92,"rated_kv":4}],
    "fuses":[{"id":"D","bus":"B","standard":"c37.41","rated_kv":5.5,"interrupting_ka":40}])"),
           {});
  BOOST_TEST(std::count_if(t.defaults.begin(), t.defaults.end(),
                           [](const DefaultUse& use) { return use.field == "pole_pairs"; }) == 1);
}

BOOST_AUTO_TEST_SUITE_END()
