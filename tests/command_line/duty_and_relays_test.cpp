// Duty, C37 and relays as a user meets them.
#include <boost/test/unit_test.hpp>
#include <map>
#include <nlohmann/json.hpp>
#include <set>

#include "reports/text_table.hpp"
#include "tests/command_line/program.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(duty_and_relays)

BOOST_AUTO_TEST_CASE(duty_judges_the_devices_of_both_families_in_the_demo) {
  const Outcome o = kiloamp_run({"duty", case_file("board_mill"), "--format", "json"});
  BOOST_TEST(o.code == 0);
  const auto json = nlohmann::json::parse(o.out);
  BOOST_TEST(json["study"] == "duty");
  BOOST_TEST(json["states"].size() == 5U);
  BOOST_TEST(json["states"][0] == "as written");
  BOOST_TEST(json["cautions"].size() >= 9U);
  std::set<std::string> standards, verdicts;
  double last = 1e9;
  std::string last_verdict;
  for (const auto& device : json["devices"]) {
    standards.insert(device["standard"].get<std::string>());
    const auto verdict = device["verdict"].get<std::string>();
    BOOST_TEST(device["sources"].size() <= 5U);
    for (const auto& check : device["checks"]) {
      if (check["verdict"] == "not evaluated") BOOST_TEST(check["why"].get<std::string>() != "");
      if (check["verdict"] == "over") BOOST_TEST(check["duty"].get<double>() > check["rating"].get<double>());
    }
    if (device["governing"].is_number()) {
      const auto& check = device["checks"][device["governing"].get<std::size_t>()];
      const double loading = check["duty"].get<double>() / check["rating"].get<double>();
      if (verdict == last_verdict) BOOST_TEST(loading <= last);  // worst first
      last = loading;
      last_verdict = verdict;
    }
    verdicts.insert(verdict);
  }
  BOOST_TEST((verdicts == std::set<std::string>{"over", "not evaluated", "marginal", "within"}));
  BOOST_TEST(standards.count("IEC 62271-100") == 1U);
  BOOST_TEST(standards.count("C37 K-factor") == 1U);
  std::size_t devices = 0;
  for (const auto& [verdict, count] : json["count"].items()) devices += count.get<std::size_t>();
  BOOST_TEST(devices == json["devices"].size());
}

BOOST_AUTO_TEST_CASE(strict_duty_says_by_its_exit_code_that_a_device_is_not_proven) {
  const Folder folder;
  const fs::path path = folder.path / "duty.csv";
  BOOST_TEST(
      kiloamp_run({"duty", case_file("board_mill"), "--strict", "--format", "csv", "--output", path.string()})
          .code == 3);
  const auto rows = lines(slurp(path));
  BOOST_TEST(rows.front() ==
             "device,kind,bus,nominal_kv,branch,standard,basis,rated_kv,quantity,unit,verdict,through_ka,x_"
             "over_r,nacd,"
             "factor,duty,rating,loading_percent,margin,margin_percent,state,fault,side,why,note,headroom_"
             "mva,sources\r");
  BOOST_TEST(rows.size() > 40U);
  const fs::path good = folder.path / "good.json";
  std::ofstream(good) << R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "A", "nominal_kv": 0.4}],
    "network_feeders": [{"id": "F", "bus": "A", "max": {"three_phase_ka": 10, "x_over_r": 4}}],
    "fuses": [{"id": "D", "bus": "A", "standard": "iec60269", "rated_kv": 0.5, "breaking_ka": 100}]})";
  BOOST_TEST(kiloamp_run({"duty", good.string(), "--strict"}).code == 0);
  BOOST_TEST(kiloamp_run({"duty", good.string(), "--strict", "--method", "c37"}).code == 3);
}

BOOST_AUTO_TEST_CASE(duty_in_one_scenario_or_with_all_outages) {
  const auto states = [](std::vector<std::string> more) {
    std::vector<std::string> arguments{"duty", case_file("board_mill"), "--format", "json"};
    arguments.insert(arguments.end(), more.begin(), more.end());
    const Outcome o = kiloamp_run(arguments);
    BOOST_TEST(o.code == 0);
    return nlohmann::json::parse(o.out)["states"];
  };
  BOOST_TEST(states({"--scenario", "T1 out"}) == nlohmann::json::parse(R"(["T1 out"])"));
  const auto all = states({"--outages"});
  BOOST_TEST(all.size() > 40U);
  BOOST_TEST((std::find(all.begin(), all.end(), "T1 out") != all.end()));
  BOOST_TEST((std::find(all.begin(), all.end(), "COUPLER-11 open") != all.end()));
}

BOOST_AUTO_TEST_CASE(c37_sweep_in_every_format) {
  const Outcome text = kiloamp_run({"sweep", case_file("board_mill"), "--method", "c37", "--fault", "3ph"});
  BOOST_TEST(text.code == 0);
  BOOST_TEST(text.out.find("interrupting") != std::string::npos);
  BOOST_TEST(text.out.find("X/R of the separate X and R networks") != std::string::npos);
  const Outcome csv = kiloamp_run({"sweep", case_file("board_mill"), "--method", "c37", "--format", "csv"});
  const auto rows = lines(csv.out);
  const auto fields = [](const std::string& row) { return std::count(row.begin(), row.end(), ','); };
  for (const std::string& row : rows) BOOST_TEST(fields(row) == fields(rows.front()));
  const Outcome o =
      kiloamp_run({"sweep", case_file("board_mill"), "--method", "c37", "--format", "json", "--cross-check"});
  BOOST_TEST(o.code == 0);
  const auto json = nlohmann::json::parse(o.out);
  BOOST_TEST(json["method"] == "c37");
  for (const auto& fault : json["faults"]) {
    const auto& c37 = fault["c37"];
    if (fault["fault"] == "three_phase")
      BOOST_TEST(c37["first_cycle"]["ez_ka"].get<double>() >= c37["interrupting"]["ez_ka"].get<double>());
    BOOST_TEST(c37["interrupting"]["nacd"].get<double>() <= 1.0);
    BOOST_TEST(std::abs(c37["first_cycle"]["ez_ka"].get<double>() - fault["current_ka"].get<double>()) <
               1e-9);
  }
}

BOOST_AUTO_TEST_CASE(c37_options_are_refused_where_they_do_not_belong) {
  const auto complains = [](std::vector<std::string> arguments, const std::string& text) {
    const Outcome o = kiloamp_run(std::move(arguments));
    BOOST_TEST(o.code == 2);
    BOOST_TEST(lines(o.err).front() == text);
  };
  complains({"sweep", case_file("board_mill"), "--small-motors", "out"},
            "kiloamp: --small-motors goes with --method c37");
  complains({"duty", case_file("board_mill"), "--method", "c37", "--duration", "3"},
            "kiloamp: --edition, --duration and --kappa-method go with --method iec60909");
  complains({"duty", case_file("board_mill"), "--method", "iec60909", "--prefault", "1.05"},
            "kiloamp: --prefault and --shunts go with --method c37");
}

// Two identical bussed lines, Z0 j0.55, Z0m j0.30, derived in closed form, no published example: the pair has
// (Z0 + Z0m)/2 = j0.425; with the second line out and earthed at both ends the first has Z0 - Z0m^2/Z0 =
// j0.386364. Z1 j0.2 each, source j0.1 in every sequence, 11 kV: line to ground at the far bus 3
// x 6.350853/(2 x 0.2 + 0.525) = 20.597361 kA with both lines, 3 x 6.350853/(2 x 0.3 + 0.486364) = 17.537920
// kA with the earthed one.
BOOST_AUTO_TEST_CASE(parallel_line_earthed_at_both_ends_through_the_command_line) {
  const Folder folder;
  const fs::path path = folder.path / "parallel.json";
  std::ofstream(path) << R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "A", "nominal_kv": 11}, {"id": "B", "nominal_kv": 11}],
    "network_feeders": [{"id": "S", "bus": "A", "max": {"r1_ohm": 0, "x1_ohm": 0.1, "r0_ohm": 0, "x0_ohm": 0.1}}],
    "lines": [
      {"id": "L1", "from": "A", "to": "B", "length_km": 1, "r1_ohm_per_km": 0, "x1_ohm_per_km": 0.2, "r0_ohm_per_km": 0, "x0_ohm_per_km": 0.55},
      {"id": "L2", "from": "A", "to": "B", "length_km": 1, "r1_ohm_per_km": 0, "x1_ohm_per_km": 0.2, "r0_ohm_per_km": 0, "x0_ohm_per_km": 0.55}],
    "mutual_couplings": [{"id": "C", "line_a": "L1", "line_b": "L2", "length_km": 1, "r0m_ohm_per_km": 0, "x0m_ohm_per_km": 0.30}],
    "relays": [{"id": "R", "bus": "A", "branch": "L1", "elements": [{"function": "earth_overcurrent", "pickup_a": 1, "curve": "iec_a", "time_multiplier": 0.1}]}]})";
  const Outcome o = kiloamp_run({"relays", path.string(), "--fault", "lg", "--format", "json"});
  BOOST_TEST(o.code == 0);
  const auto json = nlohmann::json::parse(o.out);
  std::map<std::string, double> fault_ka;
  for (const auto& row : json["locations"][0]["rows"])
    if (row["place"] == "remote bus")
      fault_ka[row["state"].get<std::string>()] = row["fault_ka"]["a"][0].get<double>();
  BOOST_TEST(std::abs(fault_ka.at("intact") - 20.597361) < 2e-6);
  BOOST_TEST(std::abs(fault_ka.at("L2 out and earthed") - 17.537920) < 2e-6);
  const Outcome csv = kiloamp_run({"relays", path.string(), "--everywhere", "--format", "csv"});
  const auto rows = lines(csv.out);
  BOOST_TEST(rows.size() > 4U * 4U);
  for (const std::string& row : rows)
    BOOST_TEST(std::count(row.begin(), row.end(), ',') == std::count(rows[0].begin(), rows[0].end(), ','));
  const Outcome text = kiloamp_run({"relays", case_file("board_mill")});
  BOOST_TEST(text.code == 0);
  BOOST_TEST(text.out.find("R-PULP-1: MAIN-11-A into C-PULP-1") != std::string::npos);
  for (const std::string& line : lines(text.out)) BOOST_TEST(display_width(line) <= 120U, line);
}

BOOST_AUTO_TEST_SUITE_END()
