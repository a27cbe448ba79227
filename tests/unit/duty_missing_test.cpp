// A datum that is missing never passes.
#include <nlohmann/json.hpp>

#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;
using Json = nlohmann::json;

BOOST_AUTO_TEST_SUITE(duty_missing)

namespace {

Json case_with(const std::string& section, const Json& device, double kv) {
  Json c = Json::parse(R"({"format":"kiloamp-case","version":1,"frequency_hz":50,
    "network_feeders":[{"id":"F","bus":"B","max":{"r1_ohm":0.05,"x1_ohm":0.5}}]})");
  c["buses"] = {{{"id", "B"}, {"nominal_kv", kv}}};
  c[section] = {device};
  return c;
}

struct Complete {
  std::string section;
  Json device;
  double kv;
  std::vector<std::string> needed;  // without one of them some check is not evaluated, and says so
};

const std::vector<Complete>& complete_devices() {
  static const std::vector<Complete> all{
      {"breakers",
       {{"standard", "iec62271-100"},
        {"breaking_ka", 25},
        {"making_peak_ka", 63},
        {"short_time_ka", 25},
        {"short_time_s", 3},
        {"opening_time_s", 0.045}},
       11,
       {"breaking_ka", "making_peak_ka", "short_time_ka", "short_time_s", "opening_time_s"}},
      {"breakers",
       {{"standard", "iec62271-103"}, {"making_peak_ka", 63}, {"short_time_ka", 25}, {"short_time_s", 3}},
       11,
       {"making_peak_ka", "short_time_ka", "short_time_s"}},
      {"breakers",
       {{"standard", "iec60947-2"}, {"icu_ka", 50}, {"ics_ka", 50}, {"icw_ka", 42}, {"icw_s", 1}},
       0.4,
       {"icu_ka", "ics_ka", "icw_ka", "icw_s"}},
      {"breakers",
       {{"standard", "iec60947-3"}, {"icm_ka", 50}, {"icw_ka", 42}, {"icw_s", 1}},
       0.4,
       {"icm_ka", "icw_ka", "icw_s"}},
      {"fuses", {{"standard", "iec60282-1"}, {"breaking_ka", 63}}, 11, {"breaking_ka"}},
      {"fuses", {{"standard", "iec60269"}, {"breaking_ka", 100}}, 0.4, {"breaking_ka"}},
      {"switchboards",
       {{"standard", "iec62271-200"}, {"short_time_ka", 25}, {"short_time_s", 3}, {"peak_withstand_ka", 63}},
       11,
       {"short_time_ka", "short_time_s", "peak_withstand_ka"}},
      {"switchboards",
       {{"standard", "iec61439"}, {"short_time_ka", 50}, {"short_time_s", 1}, {"peak_withstand_ka", 105}},
       0.4,
       {"short_time_ka", "short_time_s", "peak_withstand_ka"}},
      {"breakers",
       {{"standard", "c37-total-current"},
        {"interrupting_mva", 500},
        {"interrupting_ka", 25},
        {"interrupting_time_cycles", 8}},
       11,
       {"interrupting_mva", "interrupting_ka", "interrupting_time_cycles"}},
      {"breakers",
       {{"standard", "c37-k-factor"},
        {"rated_kv", 12},
        {"k_factor", 1.3},
        {"interrupting_ka", 25},
        {"interrupting_time_cycles", 5}},
       11,
       {"rated_kv", "k_factor", "interrupting_ka", "interrupting_time_cycles"}},
      {"breakers",
       {{"standard", "c37-constant-ka"},
        {"rated_kv", 15},
        {"interrupting_ka", 25},
        {"contact_parting_cycles", 3}},
       11,
       {"rated_kv", "interrupting_ka", "contact_parting_cycles"}},
      {"breakers",
       {{"standard", "c37.13"},
        {"interrupting_ka", 25},
        {"instantaneous_trip", false},
        {"short_time_ka", 25}},
       0.4,
       {"interrupting_ka", "instantaneous_trip", "short_time_ka"}},
      {"breakers", {{"standard", "ul489"}, {"interrupting_ka", 25}}, 0.4, {"interrupting_ka"}},
      {"fuses", {{"standard", "c37.41"}, {"interrupting_ka", 25}}, 11, {"interrupting_ka"}},
      {"fuses", {{"standard", "ul248"}, {"interrupting_ka", 200}}, 0.4, {"interrupting_ka"}},
      {"switchboards",
       {{"standard", "c37.20"}, {"short_time_ka", 25}, {"peak_withstand_ka", 67}},
       11,
       {"short_time_ka", "peak_withstand_ka"}}};
  return all;
}

DutyTable judged(const Complete& c, const Json& device, bool without_voltage = false) {
  Json one = device;
  one["id"] = "D";
  one["bus"] = "B";
  if (!one.contains("rated_kv") && !without_voltage) one["rated_kv"] = c.kv * 1.1;
  return duty(read_text(case_with(c.section, one, c.kv).dump()), {});
}

}  // namespace

BOOST_AUTO_TEST_CASE(a_complete_device_is_evaluated_wholly) {
  for (const Complete& c : complete_devices()) {
    BOOST_TEST_CONTEXT(c.device.dump()) {
      const DutyTable t = judged(c, c.device);
      BOOST_REQUIRE(t.devices.size() == 1U);
      BOOST_TEST(!t.devices[0].checks.empty());
      for (const DutyCheck& check : t.devices[0].checks) BOOST_TEST(check.why == "");
      BOOST_TEST((t.devices[0].verdict != Verdict::not_evaluated));
    }
  }
}

BOOST_AUTO_TEST_CASE(each_missing_datum_is_named_and_never_passes) {
  for (const Complete& c : complete_devices())
    for (const std::string& field : c.needed) {
      BOOST_TEST_CONTEXT(c.device.dump() << " without " << field) {
        Json device = c.device;
        device.erase(field);
        const DutyTable t = judged(c, device, field == "rated_kv");
        BOOST_REQUIRE(t.devices.size() == 1U);
        bool named = false;
        for (const DutyCheck& check : t.devices[0].checks)
          if (check.verdict == Verdict::not_evaluated)
            named = named || check.why.find(field) != std::string::npos;
        BOOST_TEST(named);
        BOOST_TEST((t.devices[0].verdict == Verdict::not_evaluated || t.devices[0].verdict == Verdict::over));
      }
    }
}

BOOST_AUTO_TEST_CASE(without_a_rated_voltage_nothing_is_proven) {
  for (const Complete& c : complete_devices()) {
    BOOST_TEST_CONTEXT(c.device.dump()) {
      Json device = c.device;
      device.erase("rated_kv");
      const DutyTable t = judged(c, device, true);
      for (const DutyCheck& check : t.devices.at(0).checks) {
        BOOST_TEST(check.why == "missing: rated_kv");
        BOOST_TEST((check.verdict == Verdict::not_evaluated));
      }
    }
  }
}

BOOST_AUTO_TEST_CASE(unknown_interrupting_time_asks_for_the_parting_time) {
  const Complete& c = complete_devices()[9];
  Json device = c.device;
  device["interrupting_time_cycles"] = 6;
  BOOST_TEST(judged(c, device).devices[0].checks[0].why ==
             "missing: contact_parting_cycles (no contact parting time is known for this interrupting time)");
}

BOOST_AUTO_TEST_CASE(a_device_without_current_in_any_state_does_not_pass) {
  Json c = case_with("breakers",
                     {{"id", "D"},
                      {"bus", "B"},
                      {"branch", "S"},
                      {"standard", "ul489"},
                      {"rated_kv", 0.48},
                      {"interrupting_ka", 25}},
                     0.4);
  c["buses"].push_back({{"id", "B2"}, {"nominal_kv", 0.4}});
  c["switches"] = {{{"id", "S"}, {"from", "B"}, {"to", "B2"}, {"closed", false}}};
  const DutyTable t = duty(read_text(c.dump()), {});
  BOOST_TEST(t.devices[0].checks[0].why == "no current through it in any state");
  BOOST_TEST((t.devices[0].verdict == Verdict::not_evaluated));
}

BOOST_AUTO_TEST_CASE(a_family_is_never_judged_with_the_other_s_current) {
  Json c = case_with(
      "fuses", {{"id", "I"}, {"bus", "B"}, {"standard", "iec60269"}, {"rated_kv", 0.5}, {"breaking_ka", 100}},
      0.4);
  c["fuses"].push_back(
      {{"id", "A"}, {"bus", "B"}, {"standard", "ul248"}, {"rated_kv", 0.6}, {"interrupting_ka", 200}});
  DutyOptions options;
  options.family = DeviceFamily::iec;
  const DutyTable t = duty(read_text(c.dump()), options);
  BOOST_REQUIRE(t.devices.size() == 2U);
  BOOST_TEST((t.devices[0].device == ElementRef{ElementKind::fuse, 1}));
  BOOST_TEST((t.devices[0].verdict == Verdict::not_evaluated));
  BOOST_TEST(t.devices[0].checks[0].why == "missing: the ANSI/IEEE calculation, left out of this run");
  BOOST_TEST((t.devices[1].verdict == Verdict::within));
  BOOST_TEST(!t.used_c37);
}

BOOST_AUTO_TEST_SUITE_END()
