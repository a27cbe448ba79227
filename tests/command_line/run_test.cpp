// The program as a user meets it: help, formats, errors, exit codes, files.
#include "io/command_line/run.hpp"

#include <boost/test/unit_test.hpp>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <set>
#include <sstream>

#include "reports/text_table.hpp"
#include "tests/command_line/program.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(command_line)

BOOST_AUTO_TEST_CASE(help_is_printed_for_the_program_and_for_each_verb) {
  for (const auto& arguments : std::vector<std::vector<std::string>>{
           {}, {"--help"}, {"sweep", "--help"}, {"fault", "--help"}, {"check", "--help"}}) {
    const Outcome o = kiloamp_run(arguments);
    BOOST_TEST(o.code == 0);
    BOOST_TEST(o.err == "");
    BOOST_TEST(o.out.find("kiloamp") != std::string::npos);
  }
  BOOST_TEST(kiloamp_run({"--version"}).out == "kiloamp 0.1.0\n");
}

BOOST_AUTO_TEST_CASE(mistakes_on_the_command_line_are_named_with_what_was_meant) {
  const std::string plant = case_file("quarry_plant");
  const auto complains = [](std::vector<std::string> arguments, const std::string& first_line) {
    const Outcome o = kiloamp_run(std::move(arguments));
    BOOST_TEST(o.code == 2);
    BOOST_TEST(o.out == "");
    BOOST_TEST(lines(o.err).front() == first_line);
  };
  complains(
      {"swep", plant},
      "kiloamp: \"swep\" is not one of check, sweep, fault, outages, duty, relays; did you mean sweep?");
  complains({"sweep", plant, "--fautl", "lg"},
            "kiloamp: \"--fautl\" is not an option here; did you mean --fault?");
  complains({"sweep", plant, "--fault", "lgg"},
            "kiloamp: --fault: \"lgg\" is not one of 3ph, lg, ll, llg; did you mean lg?");
  complains({"sweep", plant, "--format", "jsn"},
            "kiloamp: --format: \"jsn\" is not one of text, csv, json; did you mean json?");
  complains({"sweep", plant, "--earth-impedance", "5"},
            "kiloamp: --earth-impedance: \"5\" is not R,X in ohm with R >= 0, for example 0.5,0");
  complains({"sweep", plant, "--prefault", "none"},
            "kiloamp: --prefault: \"none\" is not case, flat or a voltage in pu up to 2");
  complains({"sweep", plant, "--bus", "MAIN-1"},
            "kiloamp: --bus \"MAIN-1\" is not a bus of this case; did you mean \"MAIN-11\"?");
  complains({"sweep", plant, "--scenario", "x"}, "kiloamp: --scenario \"x\" is not a scenario of this case");
  complains({"sweep", plant, "--table", "contributions"}, "kiloamp: --table goes with --format csv");
  complains({"fault", plant}, "kiloamp: --bus is required");
}

BOOST_AUTO_TEST_CASE(every_wrong_id_is_named_at_once) {
  const Outcome o =
      kiloamp_run({"sweep", case_file("quarry_plant"), "--bus", "P", "--bus", "Q", "--scenario", "R"});
  BOOST_TEST(o.code == 2);
  BOOST_TEST(lines(o.err).size() == 3U);
}

// Source j1 ohm at 10 kV: 10/sqrt(3) = 5.774 kA; X0 = 2 ohm: LG sqrt(3) 10/4 = 4.330 kA; LL 5.000 kA; LLG: I1
// = 5.7735/(1 + 2/3) = 3.464, I0 = -I1/3 = 1.155, earth 3.464 kA, phase |a^2 I1 + a I2 + I0| with I2 =
// -2.309: sqrt(5^2 + 1.732^2) = 5.292 kA. No resistance: kappa = 2.
BOOST_AUTO_TEST_CASE(text_of_a_hand_worked_case_byte_for_byte) {
  const Folder folder;
  const fs::path file = folder.path / "hand.json";
  std::ofstream(file)
      << R"({"format":"kiloamp-case","version":1,"title":"Hand","frequency_hz":50,"buses":[{"id":"B","nominal_kv":10}],
    "network_feeders":[{"id":"Q","bus":"B","max":{"r1_ohm":0,"x1_ohm":1,"r2_ohm":0,"x2_ohm":1,"r0_ohm":0,"x0_ohm":2}}]})";
  const Outcome o = kiloamp_run({"sweep", file.string(), "--threads", "1"});
  BOOST_TEST(o.code == 0);
  const std::string table = o.out.substr(o.out.find("\n\n") + 2);
  BOOST_TEST(table.substr(0, table.find("\n\n")) ==
             "bus  nominal  fault  current  X/R   peak  earth   R1     X1   R0     X0\n"
             "          kV              kA          kA     kA  ohm    ohm  ohm    ohm\n"
             "B      10.00  3ph      5.774    -  16.33  0.0    0.0  1.000  0.0  2.000\n"
             "              LG       4.330    -  12.25  4.330  0.0  1.000  0.0  2.000\n"
             "              LL       5.000    -  14.14  0.0    0.0  1.000  0.0  2.000\n"
             "              LLG      5.292    -  14.97  3.464  0.0  1.000  0.0  2.000");
}

BOOST_AUTO_TEST_CASE(text_fits_120_columns_and_ends_with_the_cautions) {
  for (const char* name : {"board_mill", "vector_groups", "three_winding_and_auto", "unearthed_network"}) {
    const Outcome o = kiloamp_run({"sweep", case_file(name), "--contributions", "--depth", "1"});
    BOOST_TEST(o.code == 0);
    for (const auto& line : lines(o.out))
      if (line.find("(/") == std::string::npos) BOOST_TEST(display_width(line) <= kTextWidth, line);
    BOOST_TEST(o.out.find("Cautions\n 1  ") != std::string::npos);
    BOOST_TEST(o.out.find("local codes by a") != std::string::npos);
  }
}

// In every row of the sweep's table the decimal point of a column stands at the same place.
BOOST_AUTO_TEST_CASE(columns_are_aligned_on_the_decimal_point) {
  TextTable table;
  table.column("name", "", TextTable::Align::left);
  table.column("value", "kA", TextTable::Align::decimal);
  table.row({"a", "1.25"});
  table.row({"b", "1234.5"});
  table.row({"c", "-"});
  table.row({"d", "0.00042"});
  BOOST_TEST(
      table.text() ==
      "name       value\n              kA\na        1.25\nb     1234.5\nc        -\nd        0.00042\n");
}

BOOST_AUTO_TEST_CASE(long_names_are_shortened_in_the_middle) {
  BOOST_TEST(shortened("TRANSFORMER-STATION-NORTH-11", 12) == "TRANSF…TH-11");
  BOOST_TEST(display_width(shortened("Übergabestation-Süd-weit-weg", 15)) == 15U);
  BOOST_TEST(display_width("変電所") == 6U);
}

BOOST_AUTO_TEST_CASE(json_carries_the_vocabulary_of_results) {
  const Outcome o = kiloamp_run(
      {"sweep", case_file("board_mill"), "--format", "json", "--depth", "1", "--scenario", "island"});
  BOOST_TEST(o.code == 0);
  const auto json = nlohmann::json::parse(o.out);
  BOOST_TEST(json["format"] == "kiloamp-results");
  BOOST_TEST(json["version"] == 1);
  BOOST_TEST(json["study"] == "sweep");
  BOOST_TEST(json["method"] == "classical");
  BOOST_TEST(json["scenario"] == "island");
  BOOST_TEST(json["case"]["sha256"].get<std::string>().size() == 64U);
  for (const char* list : {"defaults_used", "warnings", "cautions"}) BOOST_TEST(!json[list].empty(), list);
  BOOST_TEST(json["faults"].size() == 38U * 4U);
  bool unearthed = false;
  for (const auto& fault : json["faults"]) {
    for (const char* name :
         {"bus", "fault", "current_ka", "x_over_r", "peak_ka", "phases", "sequence", "earth_current_ka",
          "z1_ohm", "z2_ohm", "z0_ohm", "contributions", "voltages", "branch_currents", "neutral_currents"})
      BOOST_TEST(fault.contains(name), name);
    if (fault["fault"] == "line_to_ground" && !fault["z1_ohm"].is_null() && fault["z0_ohm"].is_null()) {
      unearthed = true;
      BOOST_TEST(fault["current_ka"] == 0.0);
    }
  }
  BOOST_TEST(unearthed);
}

BOOST_AUTO_TEST_CASE(csv_rows_have_the_columns_of_their_head) {
  for (const auto& more : std::vector<std::vector<std::string>>{
           {"--table", "faults"},
           {"--table", "contributions"},
           {"--method", "iec60909"},
           {"--method", "iec60909", "--case-kind", "both", "--table", "contributions"}}) {
    std::vector<std::string> arguments{"sweep", case_file("board_mill"), "--format", "csv"};
    arguments.insert(arguments.end(), more.begin(), more.end());
    const Outcome o = kiloamp_run(arguments);
    BOOST_TEST(o.code == 0);
    const auto rows = lines(o.out);
    BOOST_TEST(rows.size() > 100U);
    const auto commas = [](const std::string& row) { return std::count(row.begin(), row.end(), ','); };
    for (const auto& row : rows) BOOST_TEST(commas(row) == commas(rows.front()), row);
  }
}

BOOST_AUTO_TEST_CASE(iec60909_says_what_it_did_and_gives_every_quantity) {
  const Outcome o =
      kiloamp_run({"sweep", case_file("eight_node_grid"), "--method", "iec60909", "--format", "json",
                   "--case-kind", "both", "--intermediate", "--tmin", "0.05", "--duration", "0.5"});
  BOOST_TEST(o.code == 0);
  const auto json = nlohmann::json::parse(o.out);
  BOOST_TEST(json["method"] == "iec60909");
  BOOST_TEST(json["case_kind"] == "both");
  BOOST_TEST(json["iec60909"]["edition"] == 2016);
  BOOST_TEST(json["iec60909"]["kappa_method"] == "c");
  BOOST_TEST(json["iec60909"]["tmin_s"] == 0.05);
  BOOST_TEST(json["iec60909"]["duration_s"] == 0.5);
  BOOST_TEST(json["faults"].size() == 10U * 4U * 2U);
  std::set<std::string> factors, kinds;
  for (const auto& c : json["corrections"]) factors.insert(c["factor"].get<std::string>());
  BOOST_TEST((factors == std::set<std::string>{"K_G", "K_S", "K_SO", "K_T", "c"}));
  std::size_t machines = 0;
  for (const auto& fault : json["faults"]) {
    kinds.insert(fault["case_kind"].get<std::string>());
    for (const char* name : {"c", "ikss_ka", "skss_mva", "r_over_x", "kappa", "ip_ka", "ib_ka", "idc_ka",
                             "ib_asymmetric_ka", "ik_ka", "m", "n", "ith_ka", "i2t_ka2s", "not_evaluated"})
      BOOST_TEST(fault["iec60909"].contains(name), name);
    if (fault["iec60909"].contains("machines")) machines += fault["iec60909"]["machines"].size();
  }
  BOOST_TEST((kinds == std::set<std::string>{"max", "min"}));
  BOOST_TEST(machines > 10U);
}

BOOST_AUTO_TEST_CASE(iec60909_refuses_a_machine_without_power_factor) {
  const Folder folder;
  const fs::path path = folder.path / "plain.json";
  std::ofstream(path) << R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "A", "nominal_kv": 10.5}],
    "synchronous_machines": [{"id": "G", "bus": "A", "role": "generator", "rated_mva": 20, "rated_kv": 10.5,
      "xd_subtransient_percent": 15, "ra_percent": 0.5}]})";
  const Outcome o = kiloamp_run({"sweep", path.string(), "--method", "iec60909"});
  BOOST_TEST(o.code == 2);
  BOOST_TEST(o.out == "");
  BOOST_TEST(o.err == path.string() +
                          ": synchronous machine \"G\" (/synchronous_machines/0), power_factor: missing\n"
                          "  IEC 60909-0 needs it for the correction factor of the machine\n"
                          "  remedy: give the rated power factor of the nameplate\n");
}

BOOST_AUTO_TEST_CASE(options_that_do_not_go_together_are_refused) {
  const std::string grid = case_file("eight_node_grid");
  const auto complains = [](std::vector<std::string> arguments, const std::string& text) {
    const Outcome o = kiloamp_run(std::move(arguments));
    BOOST_TEST(o.code == 2);
    BOOST_TEST(lines(o.err).front() == text);
  };
  complains(
      {"sweep", grid, "--tmin", "0.1"},
      "kiloamp: --edition, --tmin, --duration, --kappa-method and --intermediate go with --method iec60909");
  complains(
      {"sweep", grid, "--method", "iec60909", "--prefault", "1.05"},
      "kiloamp: --method iec60909 has its own voltage, bolted faults and no shunts: leave out --prefault, "
      "--phase-impedance, --earth-impedance and --shunts");
  complains({"sweep", grid, "--method", "iec60909", "--intermediate"},
            "kiloamp: --intermediate goes with --format json");
}

BOOST_AUTO_TEST_CASE(largest_and_smallest_stand_side_by_side) {
  const Outcome o = kiloamp_run({"sweep", case_file("quarry_plant"), "--method", "iec60909", "--case-kind",
                                 "both", "--fault", "3ph,lg", "--bus", "MAIN-11"});
  BOOST_TEST(o.code == 0);
  const auto all = lines(o.out);
  const auto head =
      std::find_if(all.begin(), all.end(), [](const auto& l) { return l.rfind("bus ", 0) == 0; });
  BOOST_REQUIRE(head != all.end());
  const char* expected[] = {"MAIN-11", "max", "min", "max", "min"};
  BOOST_TEST((head + 2)->rfind(expected[0], 0) == 0U);
  for (int row = 0; row < 4; ++row)
    BOOST_TEST((head + 2 + row)->find(expected[row + 1]) != std::string::npos, *(head + 2 + row));
}

BOOST_AUTO_TEST_CASE(a_bad_case_leaves_the_output_file_alone) {
  const Folder folder;
  const fs::path target = folder.path / "out.txt", bad = folder.path / "bad.json";
  std::ofstream(target) << "before";
  std::ofstream(bad) << "{\"format\": \"kiloamp-case\"";
  const Outcome o = kiloamp_run({"sweep", bad.string(), "--output", target.string()});
  BOOST_TEST(o.code == 2);
  BOOST_TEST(slurp(target) == "before");
  BOOST_TEST(kiloamp_run({"sweep", case_file("quarry_plant"), "--output", target.string()}).code == 0);
  BOOST_TEST(slurp(target) == kiloamp_run({"sweep", case_file("quarry_plant")}).out);
  BOOST_TEST(std::distance(fs::directory_iterator(folder.path), fs::directory_iterator{}) == 2);
  const Outcome lost = kiloamp_run(
      {"sweep", case_file("quarry_plant"), "--output", (folder.path / "no/such/folder.txt").string()});
  BOOST_TEST(lost.code == 1);
  BOOST_TEST(lost.err.find("cannot be written") != std::string::npos);
}

BOOST_AUTO_TEST_CASE(inconsistent_vector_groups_are_refused_with_the_loop) {
  const Folder folder;
  const fs::path file = folder.path / "loop.json";
  std::ofstream(file)
      << R"({"format":"kiloamp-case","version":1,"frequency_hz":50,"buses":[{"id":"H","nominal_kv":33},{"id":"L","nominal_kv":11}],
    "network_feeders":[{"id":"Q","bus":"H","max":{"three_phase_ka":10,"x_over_r":10}}],
    "transformers":[{"id":"T1","hv_bus":"H","lv_bus":"L","rated_mva":10,"hv_kv":33,"lv_kv":11,"z_percent":10,"x_over_r":20,"vector_group":"Dyn11"},
                    {"id":"T2","hv_bus":"H","lv_bus":"L","rated_mva":10,"hv_kv":33,"lv_kv":11,"z_percent":10,"x_over_r":20,"vector_group":"Dyn1"}]})";
  const Outcome o = kiloamp_run({"sweep", file.string()});
  BOOST_TEST(o.code == 2);
  BOOST_TEST(o.err.find("loop of \"T1\" Dyn11, \"T2\" Dyn1: phase shifts add up to") != std::string::npos,
             o.err);
}

// Options that change the answer: through impedances, prefault voltage, shunts, weak case, depth.
BOOST_AUTO_TEST_CASE(options_change_what_they_say) {
  const auto current = [](std::vector<std::string> more, const std::string& kind) {
    std::vector<std::string> arguments{"sweep",  case_file("unearthed_network"), "--format", "json", "--bus",
                                       "KIOSK-2"};
    arguments.insert(arguments.end(), more.begin(), more.end());
    const auto json = nlohmann::json::parse(kiloamp_run(std::move(arguments)).out);
    for (const auto& fault : json["faults"])
      if (fault["fault"] == kind) return fault["current_ka"].get<double>();
    return -1.0;
  };
  const double ph3 = current({}, "three_phase"), lg = current({}, "line_to_ground");
  BOOST_TEST(current({"--prefault", "1.1"}, "three_phase") == 1.1 * ph3, boost::test_tools::tolerance(1e-9));
  BOOST_TEST(current({"--phase-impedance", "1,0"}, "three_phase") < ph3);
  BOOST_TEST(current({"--earth-impedance", "500,0"}, "line_to_ground") < lg);
  BOOST_TEST(current({"--earth-impedance", "500,0"}, "three_phase") == ph3);
  BOOST_TEST(current({"--shunts"}, "three_phase") != ph3);
  BOOST_TEST(current({"--fault", "ll"}, "three_phase") == -1.0);
  // Capacitive: sqrt(3) U w C0 = sqrt(3) 20 kV 10.5 km 85 uS/km = 30.9 A; the longitudinal impedances change
  // it by less than 2 %.
  BOOST_TEST(lg == std::sqrt(3.0) * 20 * 10.5 * 85e-6, boost::test_tools::tolerance(0.02));
}

BOOST_AUTO_TEST_CASE(cross_check_is_printed_and_agrees) {
  const Outcome o = kiloamp_run({"sweep", case_file("board_mill"), "--cross-check", "--depth", "1"});
  BOOST_TEST(o.code == 0);
  BOOST_TEST(
      o.out.find("cross-check  solved again in phase coordinates: 148 faults, largest relative difference") !=
      std::string::npos);
}

// Two sources of 1 and 4 ohm at 10 kV on one bus: intact 10/sqrt(3)/0.8 = 7.217 kA, without either 1.443
// and 5.774 kA.
BOOST_AUTO_TEST_CASE(outages_of_a_hand_worked_case) {
  const Folder folder;
  const fs::path file = folder.path / "two.json";
  std::ofstream(file)
      << R"({"format":"kiloamp-case","version":1,"frequency_hz":50,"buses":[{"id":"B","nominal_kv":10,"zone":"z"}],
    "network_feeders":[{"id":"Q1","bus":"B","max":{"r1_ohm":0,"x1_ohm":1}},{"id":"Q4","bus":"B","max":{"r1_ohm":0,"x1_ohm":4}}]})";
  const Outcome o = kiloamp_run(
      {"outages", file.string(), "--format", "json", "--area", "z", "--elements", "feeders", "--depth", "0"});
  BOOST_TEST(o.code == 0);
  const auto row = nlohmann::json::parse(o.out)["buses"][0];
  const auto close = boost::test_tools::tolerance(1e-4);
  BOOST_TEST(row["intact_ka"].get<double>() == 7.2169, close);
  BOOST_TEST(row["smallest_ka"].get<double>() == 1.4434, close);
  BOOST_TEST(row["smallest_outage"] == "Q1");
  BOOST_TEST(row["largest_outage"].is_null());
  BOOST_TEST(kiloamp_run({"outages", file.string(), "--elements", "lines", "--format", "csv"})
                 .out.find("B,10.000000,three_phase,7.216878,7.216878,,7.216878,\r\n") != std::string::npos);
  BOOST_TEST(kiloamp_run({"outages", file.string(), "--area", "y"}).code == 2);
}

BOOST_AUTO_TEST_SUITE_END()
