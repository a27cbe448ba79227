// Radial examples worked by hand, one per generation of devices; the arithmetic stands beside each.
#include <cmath>

#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(duty_examples)

namespace {

constexpr double kFiveDigits = 2e-5;  // relative: the hand values below have six digits

// One feeder, one bus, one device of the bus; no machine, so NACD is 1 and nothing decays.
DutyTable one_device(double hz, double kv, double r_ohm, double x_ohm, const std::string& section,
                     const std::string& device, DutyOptions options = {}) {
  const auto text = [](double v) { return std::to_string(v); };
  return duty(read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":)" + text(hz) +
                        R"(,"buses":[{"id":"B","nominal_kv":)" + text(kv) +
                        R"(}],"network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":)" + text(r_ohm) +
                        R"(,"x1_ohm":)" + text(x_ohm) + R"(}}],")" + section + R"(":[{"id":"D","bus":"B",)" +
                        device + "}]}"),
              options);
}
// 13.8 kV behind 0.02 + j0.40 ohm: Z 0.400500, I = 13.8/sqrt(3)/0.400500 = 19.8937 kA, X/R 20.
DutyTable medium_voltage(const std::string& section, const std::string& device) {
  return one_device(60, 13.8, 0.02, 0.40, section, device);
}
// 480 V behind 1.6 + j12.8 mohm: Z 12.8996 mohm, I = 0.48/sqrt(3)/0.0128996 = 21.4834 kA, X/R 8.
DutyTable low_voltage(const std::string& section, const std::string& device) {
  return one_device(60, 0.48, 0.0016, 0.0128, section, device);
}

void expect(const DutyTable& table, DutyQuantity quantity, double duty, double rating, Verdict verdict) {
  BOOST_REQUIRE(table.devices.size() == 1U);
  for (const DutyCheck& c : table.devices[0].checks) {
    if (c.quantity != quantity) continue;
    BOOST_TEST_CONTEXT(quantity_name(quantity)) {
      BOOST_TEST(std::abs(c.duty - duty) <= kFiveDigits * duty, c.duty << " against " << duty);
      BOOST_TEST(std::abs(c.rating - rating) <= kFiveDigits * rating, c.rating << " against " << rating);
      BOOST_TEST(verdict_name(c.verdict) == verdict_name(verdict));
    }
    return;
  }
  BOOST_ERROR("no such check");
}

}  // namespace

BOOST_AUTO_TEST_CASE(breaker_rated_on_total_current) {
  const auto t =
      medium_voltage("breakers", R"("standard":"c37-total-current","rated_kv":15,"interrupting_mva":500,
    "interrupting_ka":25,"interrupting_time_cycles":8)");
  // 8 cycles: parting at 4. sqrt(1 + 2 e^(-16 pi/20)) = sqrt(1 + 2 x 0.0809956) = 1.07795; 19.8937 x 1.07795
  // = 21.4445. Capability: 500 / (sqrt(3) 13.8) = 20.9185, below 25.
  expect(t, DutyQuantity::breaking, 21.4445, 20.9185, Verdict::over);
  // First cycle: sqrt(1 + 2 e^(-2 pi/20)) = 1.568695; 31.2072 against 1.6 x 25.
  expect(t, DutyQuantity::close_latch_rms, 31.2072, 40, Verdict::within);
  // Headroom: 20.9185 / 1.07795 - 19.8937 = 19.4058 - 19.8937 = -0.4879 kA; x sqrt(3) x 13.8 = -11.66 MVA.
  BOOST_TEST(std::abs(*t.devices[0].headroom_mva + 11.66) < 0.02);
}

BOOST_AUTO_TEST_CASE(breaker_with_voltage_range_factor) {
  const auto t = medium_voltage("breakers", R"("standard":"c37-k-factor","rated_kv":15,"k_factor":1.3,
    "interrupting_ka":18,"interrupting_time_cycles":5)");
  // 5 cycles: parting at 3, S 1.1. e^(-12 pi/20) = 0.151836; sqrt(1.303672) = 1.141784; / 1.1 = 1.037986;
  // 19.8937 x 1.037986 = 20.6494. Capability 18 x 15 / 13.8 = 19.5652, below K I = 23.4.
  expect(t, DutyQuantity::breaking, 20.6494, 19.5652, Verdict::over);
  // 1.6 x 23.4 = 37.44.
  expect(t, DutyQuantity::close_latch_rms, 31.2072, 37.44, Verdict::within);
  // Crest: t = 0.49 - 0.1 e^(-20/3) = 0.489873; sqrt(2) (1 + e^(-2 pi 0.489873/20)) = 2.626703; 52.2549
  // against 2.7 x 23.4 = 63.18.
  expect(t, DutyQuantity::making_peak, 52.2549, 63.18, Verdict::within);
  BOOST_REQUIRE(t.devices[0].findings.size() == 1U);
  // E/X = 13.8/sqrt(3)/0.4 = 19.9186: above the capability, so the simplified check does not suffice.
  BOOST_TEST(
      t.devices[0].findings[0] ==
      "simplified check, three-phase or two-phase: E/X 19.92 kA, X/R 20.0 against 19.57 kA does not suffice: "
      "the factors decide");
}

BOOST_AUTO_TEST_CASE(breaker_of_the_constant_generation) {
  const auto t =
      medium_voltage("breakers", R"("standard":"c37-constant-ka","rated_kv":15,"interrupting_ka":25,
    "interrupting_time_cycles":5)");
  // tau = 20 / (2 pi 60) = 53.0516 ms, t = 3/60 s: sqrt(1 + 2 e^(-1.884956)) = 1.141784; at 45 ms
  // sqrt(1 + 2 e^(-2.222222)) = 1.103058; ratio 1.035109; 20.5922 against 25.
  expect(t, DutyQuantity::breaking, 20.5922, 25, Verdict::within);
  expect(t, DutyQuantity::making_peak, 52.2549, 65, Verdict::within);  // 2.6 x 25
}

BOOST_AUTO_TEST_CASE(owner_s_curve_is_mixed_by_nacd) {
  // A generator alone, X"d 0.4 ohm on 13.8 kV: 13.8^2/100 x 21.0040 % = 0.4; NACD 0, so the factor is the
  // curve's: X/R 20 lies halfway between 10 (1.00) and 30 (1.10): 1.05. 19.8937 x 1.05 = 20.8884.
  const Network n = read_text(R"({"format":"kiloamp-case","version":1,"frequency_hz":60,
    "buses":[{"id":"B","nominal_kv":13.8}],
    "synchronous_machines":[{"id":"G","bus":"B","role":"generator","rated_mva":100,"rated_kv":13.8,
      "xd_subtransient_percent":21.003991,"x_over_r":20}],
    "breakers":[{"id":"D","bus":"B","standard":"c37-k-factor","rated_kv":15,"k_factor":1.3,"interrupting_ka":18,
      "interrupting_time_cycles":5,"local_curve_x_over_r":[10,30],"local_curve_factor":[1.0,1.1]}]})");
  const auto t = duty(n, {});
  expect(t, DutyQuantity::breaking, 20.8884, 19.5652, Verdict::over);
  BOOST_TEST(std::abs(*t.devices[0].checks[0].nacd) < 1e-9);
}

BOOST_AUTO_TEST_CASE(low_voltage_power_breaker) {
  const auto unfused = low_voltage("breakers", R"("standard":"c37.13","rated_kv":0.508,"interrupting_ka":22,
    "instantaneous_trip":false,"short_time_ka":22)");
  // Test X/R tan(acos 0.15) = 6.59124; (1 + e^(-pi/8)) / (1 + e^(-pi/6.59124)) = 1.675232/1.620871
  // = 1.033538; 22.2040 against 22.
  expect(unfused, DutyQuantity::breaking, 22.2040, 22, Verdict::over);
  expect(unfused, DutyQuantity::short_time, 21.4834, 22, Verdict::marginal);
  const auto fused =
      low_voltage("breakers", R"("standard":"c37.13","rated_kv":0.508,"interrupting_ka":200,"fused":true,
    "instantaneous_trip":true)");
  // Test X/R 4.89898: sqrt(1 + 2 e^(-2 pi/8)) / sqrt(1 + 2 e^(-2 pi/4.89898)) = 1.382869/1.247007 = 1.108951.
  expect(fused, DutyQuantity::breaking, 23.8241, 200, Verdict::within);
  BOOST_TEST(fused.devices[0].checks.size() == 1U);
}

BOOST_AUTO_TEST_CASE(moulded_case_breakers_by_their_test_power_factor) {
  // Above 20 kA: test X/R 4.89898, factor 1.675232/1.526619 = 1.097347; 23.5748 against 25.
  expect(low_voltage("breakers", R"("standard":"ul489","rated_kv":0.48,"interrupting_ka":25)"),
         DutyQuantity::breaking, 23.5748, 25, Verdict::marginal);
  // 10 to 20 kA: test X/R 3.17980, factor 1.220724; 26.2254 against 18.
  expect(low_voltage("breakers", R"("standard":"ul489","rated_kv":0.48,"interrupting_ka":18)"),
         DutyQuantity::breaking, 26.2254, 18, Verdict::over);
  // Up to 10 kA: test X/R 1.73205, factor 1.440399; 30.9447 against 10.
  expect(low_voltage("breakers", R"("standard":"ul489","rated_kv":0.48,"interrupting_ka":10)"),
         DutyQuantity::breaking, 30.9447, 10, Verdict::over);
}

BOOST_AUTO_TEST_CASE(ansi_fuses_and_switchgear) {
  expect(low_voltage("fuses", R"("standard":"ul248","rated_kv":0.6,"interrupting_ka":200)"),
         DutyQuantity::breaking, 23.8241, 200, Verdict::within);
  // Tested at X/R 15: 1.568695 / sqrt(1 + 2 e^(-2 pi/15)) = 1.568695/1.521699 = 1.030884; 20.5084 against 25.
  expect(medium_voltage("fuses", R"("standard":"c37.41","rated_kv":15.5,"interrupting_ka":25)"),
         DutyQuantity::breaking, 20.5084, 25, Verdict::within);
  const auto gear = medium_voltage("switchboards", R"("standard":"c37.20","rated_kv":15,"short_time_ka":18,
    "peak_withstand_ka":52)");
  expect(gear, DutyQuantity::short_time, 19.8937, 18, Verdict::over);
  expect(gear, DutyQuantity::peak_withstand, 52.2549, 52, Verdict::over);
}

// 11 kV, c 1.1, behind 0.05 + j0.5 ohm: I"k = 1.1 x 11/sqrt(3)/0.502494 = 13.9025 kA, R/X 0.1; one branch, so
// that the equivalent frequency changes nothing: kappa = 1.02 + 0.98 e^-0.3 = 1.746002, ip = 34.3284 kA.
BOOST_AUTO_TEST_CASE(iec_high_voltage_breaker) {
  const auto t =
      one_device(50, 11, 0.05, 0.5, "breakers", R"("standard":"iec62271-100","rated_kv":12,"breaking_ka":16,
    "making_peak_ka":40,"short_time_ka":16,"short_time_s":1,"opening_time_s":0.045)");
  expect(t, DutyQuantity::breaking, 13.9025, 16, Verdict::within);
  // 55 ms after the start: network e^(-2 pi 50 x 0.055 x 0.1) = 17.7661 %, rated e^(-55/45) = 29.4575 %.
  expect(t, DutyQuantity::dc_component, 17.7661, 29.4575, Verdict::within);
  // 13.9025 sqrt(1 + 2 x 0.177661^2) = 14.3346; 16 sqrt(1 + 2 x 0.294575^2) = 17.3329.
  expect(t, DutyQuantity::total_breaking, 14.3346, 17.3329, Verdict::within);
  expect(t, DutyQuantity::making_peak, 34.3284, 40, Verdict::within);
  // m = (0.746002^200 - 1) / (100 ln 0.746002) = 0.0341265, n = 1: 13.9025 sqrt(1.0341265) = 14.1378.
  expect(t, DutyQuantity::short_time, 14.1378, 16, Verdict::within);
  // For 4 s a rating for 1 s counts half: m = 0.00853, Ith = 13.9617 against 8.
  DutyOptions four_seconds;
  four_seconds.study.iec60909.duration_s = 4;
  expect(
      one_device(50, 11, 0.05, 0.5, "breakers", R"("standard":"iec62271-100","rated_kv":12,"breaking_ka":16,
    "making_peak_ka":40,"short_time_ka":16,"short_time_s":1,"opening_time_s":0.045)",
                 four_seconds),
      DutyQuantity::short_time, 13.9025 * std::sqrt(1 + 0.0341265 / 4), 8, Verdict::over);
}

BOOST_AUTO_TEST_CASE(iec_switch_fuse_and_switchboard) {
  const auto isolator = one_device(50, 11, 0.05, 0.5, "breakers", R"("standard":"iec62271-103","rated_kv":12,
    "making_peak_ka":31.5,"short_time_ka":12.5,"short_time_s":1)");
  expect(isolator, DutyQuantity::making_peak, 34.3284, 31.5, Verdict::over);
  expect(isolator, DutyQuantity::short_time, 14.1378, 12.5, Verdict::over);
  expect(one_device(50, 11, 0.05, 0.5, "fuses", R"("standard":"iec60282-1","rated_kv":12,"breaking_ka":40)"),
         DutyQuantity::breaking, 13.9025, 40, Verdict::within);
  const auto board = one_device(50, 11, 0.05, 0.5, "switchboards", R"("standard":"iec62271-200","rated_kv":12,
    "short_time_ka":16,"short_time_s":1,"peak_withstand_ka":40)");
  expect(board, DutyQuantity::short_time, 14.1378, 16, Verdict::within);
  expect(board, DutyQuantity::peak_withstand, 34.3284, 40, Verdict::within);
}

// 400 V, c 1.1, behind 4 + j12 mohm: I"k = 0.44/sqrt(3)/0.0126491 = 20.0832 kA, power factor 0.316, kappa
// = 1.02 + 0.98 e^-1 = 1.380522, ip = 39.2094 kA, Ith = 20.1868 kA.
BOOST_AUTO_TEST_CASE(iec_low_voltage_breaker) {
  const auto t =
      one_device(50, 0.4, 0.004, 0.012, "breakers", R"("standard":"iec60947-2","rated_kv":0.415,"icu_ka":25,
    "ics_ka":18.75,"icw_ka":12,"icw_s":1)");
  expect(t, DutyQuantity::breaking, 20.0832, 25, Verdict::within);
  expect(t, DutyQuantity::service_breaking, 20.0832, 18.75, Verdict::over);
  expect(t, DutyQuantity::making_peak, 39.2094, 2.1 * 25, Verdict::within);  // Icm by table 2
  expect(t, DutyQuantity::short_time, 20.1868, 12, Verdict::over);
  // Up to 20 kA the test has power factor 0.3, below the network's: no note. Above 50 kA 0.2.
  const auto stiff =
      one_device(50, 0.4, 0.001, 0.012, "breakers", R"("standard":"iec60947-2","rated_kv":0.415,
    "icu_ka":25,"ics_ka":25,"instantaneous_trip":true)");
  BOOST_TEST(stiff.devices[0].checks[0].note ==
             "power factor 0.08 below the 0.25 of its test: the making current decides");
}

BOOST_AUTO_TEST_SUITE_END()
