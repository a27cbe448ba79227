// IEC 60909-0 on whole networks, against the examples of IEC TR 60909-4.
#include <cmath>
#include <map>

#include "engine/study/outages.hpp"
#include "tests/support/case_study.hpp"
#include "tests/support/near.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(iec60909_networks)

namespace {

struct Solved {
  FaultResult result;
  iec60909::Quantities quantities;
};

Solved solve(const Study& study, BusIndex bus, FaultKind wanted) {
  Solved solved;
  FaultLoop loop(study);
  loop.at_bus(bus, [&](const StudiedFault& fault) {
    if (fault.result.fault.kind == wanted) solved = {fault.result, *fault.iec60909};
  });
  return solved;
}

StudyOptions iec() {
  StudyOptions options;
  options.method = Method::iec60909;
  return options;
}

double factor(const Study& study, const std::string& id, const std::string& name, int part = 0) {
  for (const auto& c : study.corrections())
    if (c.name == name && c.part == part && element(study.network(), c.element).id == id) return c.factor;
  throw std::runtime_error("no " + name + " of " + id);
}

Complex corrected(const Study& study, const std::string& id, int part = 0) {
  for (const auto& c : study.corrections())
    if (c.part == part && element(study.network(), c.element).id == id)
      return *iec60909::corrected_ohm(study.network(), c);
  throw std::runtime_error("no correction of " + id);
}

}  // namespace

// Source: IEC TR 60909-4:2000, clause 6, three-phase faults: from memory, recomputed. tmin 0.1 s. Tolerances:
// half a unit of the last digit, 0.001 kA on Ib and Ik.
BOOST_AUTO_TEST_CASE(eight_node_network_three_phase) {
  const CaseStudy c(read("cases/eight_node_grid.json"), iec());
  struct Row {
    const char* bus;
    double ikss, ib, ik, ip, ip_tolerance;
  };
  for (const Row& row :
       {Row{"N1", 40.6447, 0, 40.635, 100.57, 0.005}, Row{"N2", 31.7831, 31.570, 31.663, 80.608, 0.0005},
        Row{"N3", 19.6730, 19.388, 19.623, 45.8111, 0.00005},
        Row{"N4", 16.2277, 16.017, 16.196, 36.84, 0.005}}) {
    const auto q = solve(c.study(), c.bus(row.bus), FaultKind::three_phase).quantities;
    BOOST_TEST_CONTEXT(row.bus) {
      BOOST_TEST(near(q.ikss_ka, row.ikss, 1e-4));
      if (row.ib > 0) BOOST_TEST(near(*q.ib_ka, row.ib, 0.001));
      BOOST_TEST(near(*q.ik_ka, row.ik, 0.001));
      BOOST_TEST(near(*q.ip_ka, row.ip, row.ip_tolerance));
      BOOST_TEST(q.not_evaluated.empty());
    }
  }
}

// The same example's intermediate values, in ohm.
BOOST_AUTO_TEST_CASE(eight_node_network_corrected_impedances) {
  const CaseStudy c(read("cases/eight_node_grid.json"), iec());
  const Study& s = c.study();
  BOOST_TEST(near(factor(s, "T1", "K_S"), 0.995975, 1e-6));
  const double t1 = 115.0 / 21, t2 = 120.0 / 10.5;
  BOOST_TEST(near(t1 * t1 * corrected(s, "G1") + corrected(s, "T1"), Complex(0.498795, 26.336676), 2e-6));
  BOOST_TEST(near(factor(s, "T2", "K_SO"), 0.876832, 1e-6));
  BOOST_TEST(near(t2 * t2 * corrected(s, "G2") + corrected(s, "T2"), Complex(1.203944, 35.340713), 2e-6));
  BOOST_TEST(near(factor(s, "T5", "K_T"), 0.974870, 1e-6));
  BOOST_TEST(near(corrected(s, "T5"), Complex(2.046454, 49.072241), 1e-6));
  BOOST_TEST(near(factor(s, "G3", "K_G"), 0.988320, 1e-6));
  BOOST_TEST(near(corrected(s, "G3"), Complex(0.017790, 1.089623), 1e-6));
  // Star of the three-winding transformers at 120 kV.
  const double to_mv = 120.0 * 120 / (400 * 400);
  const Complex ab = corrected(s, "T3", 0) * to_mv, ac = corrected(s, "T3", 1) * to_mv,
                bc = corrected(s, "T3", 2);
  BOOST_TEST(near((ab + ac - bc) / 2.0, Complex(0.045714, 8.096989), 1e-6));
  BOOST_TEST(near((ab + bc - ac) / 2.0, Complex(0.053563, -0.079062), 1e-6));
  BOOST_TEST(near((ac + bc - ab) / 2.0, Complex(0.408568, 20.292035), 1e-6));
  // The recalled factors 1.002922 and 0.985848 differ from those that its impedances of 18.195035 and 198.733
  // ohm contain, 2.1 X of the hv-mv pair each: these are compared.
  const double x_hv_mv = std::sqrt(0.21 * 0.21 - 0.0026 * 0.0026) / 350;
  BOOST_TEST(near(2.1 * x_hv_mv * 120 * 120 * factor(s, "T3", "K_T", 2), 18.195035, 1e-4));
  BOOST_TEST(near(2.1 * x_hv_mv * 400 * 400 * factor(s, "T4", "K_T", 1), 198.733, 5e-4));
  const Network& n = s.network();
  BOOST_TEST(near(*motor_impedance_ohm(n.induction_motors[0])[kPositive], Complex(0.341497, 3.414968), 1e-6));
  BOOST_TEST(
      near(*motor_impedance_ohm(n.induction_motors[1])[kPositive], Complex(0.824274, 8.242735) / 2.0, 1e-6));
}

// Source: the same, line-to-earth faults: from memory, recomputed. Tolerance 3e-4 kA.
BOOST_AUTO_TEST_CASE(eight_node_network_line_to_earth) {
  const CaseStudy c(read("cases/eight_node_grid.json"), iec());
  BOOST_TEST(
      near(solve(c.study(), c.bus("N1"), FaultKind::line_to_ground).quantities.ikss_ka, 24.6526, 3e-4));
  BOOST_TEST(
      near(solve(c.study(), c.bus("N3"), FaultKind::line_to_ground).quantities.ikss_ka, 10.4106, 3e-4));
}

// Source: IEC TR 60909-4:2000, clause 5, power station unit at 220 kV: from memory, recomputed
// (K_S 0.912880 with x_T = uk there; tolerance 0.001, 0.02 ohm, 0.002 kA).
BOOST_AUTO_TEST_CASE(power_station_unit_with_on_load_tap_changer) {
  const CaseStudy c(read_text(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "220", "nominal_kv": 220}, {"id": "21", "nominal_kv": 21}],
    "synchronous_machines": [{"id": "G", "bus": "21", "role": "generator", "rated_mva": 250, "rated_kv": 21,
      "power_factor": 0.78, "xd_subtransient_percent": 17, "ra_percent": 0.14172335600907}],
    "transformers": [{"id": "T", "hv_bus": "220", "lv_bus": "21", "rated_mva": 250, "hv_kv": 240, "lv_kv": 21,
      "z_percent": 15, "load_loss_kw": 520, "vector_group": "YNd5", "on_load_tap_changer": true}],
    "power_station_units": [{"id": "S", "machine": "G", "transformer": "T"}]})"),
                    iec());
  const double t = 240.0 / 21;
  BOOST_TEST(near(factor(c.study(), "G", "K_S"), 0.912880, 0.001));
  BOOST_TEST(
      near(t * t * corrected(c.study(), "G") + corrected(c.study(), "T"), Complex(0.735, 67.313), 0.02));
  const Solved fault = solve(c.study(), c.bus("220"), FaultKind::three_phase);
  BOOST_TEST(near(fault.result.sequence_ka[kPositive], Complex(0.02269, -2.07576), 0.002));
}

// Closed form: between generator and unit transformer the generator gives c U / (sqrt(3) K_G,S |Z_G|) and the
// grid c U / (sqrt(3) |K_T,S Z_T + Z_Q|), K_G,S = c / (1 + x"d sin phi), K_T,S = c / (1 - x_T sin phi) (IEC
// 60909-0:2016, 6.7.1, from memory).
BOOST_AUTO_TEST_CASE(fault_between_generator_and_unit_transformer) {
  const CaseStudy c(read_text(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "110", "nominal_kv": 110}, {"id": "10", "nominal_kv": 10.5}],
    "network_feeders": [{"id": "Q", "bus": "110", "max": {"r1_ohm": 0, "x1_ohm": 4}}],
    "synchronous_machines": [{"id": "G", "bus": "10", "role": "generator", "rated_mva": 100, "rated_kv": 10.5,
      "power_factor": 0.8, "xd_subtransient_percent": 20, "ra_percent": 0}],
    "transformers": [{"id": "T", "hv_bus": "110", "lv_bus": "10", "rated_mva": 100, "hv_kv": 110, "lv_kv": 10.5,
      "z_percent": 12, "r_percent": 0, "vector_group": "YNd5", "on_load_tap_changer": true}],
    "power_station_units": [{"id": "S", "machine": "G", "transformer": "T"}]})"),
                    iec());
  const double kg = 1.1 / (1 + 0.2 * 0.6), kt = 1.1 / (1 - 0.12 * 0.6);
  const double zg = 10.5 * 10.5 / 100 * 0.2 * kg;
  const double zt = 10.5 * 10.5 / 100 * 0.12 * kt + 4 * 10.5 * 10.5 / (110 * 110);
  const double expected = 1.1 * 10.5 / std::sqrt(3.0) * (1 / zg + 1 / zt);
  BOOST_TEST(near(solve(c.study(), c.bus("10"), FaultKind::three_phase).quantities.ikss_ka, expected, 1e-9));
}

// An outage study starts from the same intact current as the sweep, inside a unit too.
BOOST_AUTO_TEST_CASE(outages_start_from_the_current_of_the_sweep) {
  const CaseStudy c(read("cases/eight_node_grid.json"), iec());
  const OutageTable table = single_outages(c.study(), {});
  BOOST_TEST(table.rows.size() == 20U);
  for (const OutageRow& row : table.rows) {
    const double intact = solve(c.study(), row.bus, row.kind).quantities.ikss_ka;
    BOOST_TEST(near(row.intact_ka, intact, 1e-9), c.study().network().bus(row.bus).id);
    if (row.intact_ka > 0) BOOST_TEST(row.smallest.current_ka < row.intact_ka);
  }
}

BOOST_AUTO_TEST_CASE(a_feeder_with_its_own_voltage_factor_keeps_it) {
  const auto text = [](const char* level) {
    return std::string(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
      "buses": [{"id": "B", "nominal_kv": 20}], "network_feeders": [{"id": "Q", "bus": "B", "max": {)") +
           level + "}}]}";
  };
  const CaseStudy plain(read_text(text(R"("three_phase_ka": 10, "x_over_r": 10)")), iec());
  BOOST_TEST(
      near(solve(plain.study(), plain.bus("B"), FaultKind::three_phase).quantities.ikss_ka, 10, 1e-12));
  const CaseStudy own(read_text(text(R"("three_phase_ka": 10, "x_over_r": 10, "voltage_factor": 1.0)")),
                      iec());
  BOOST_TEST(near(solve(own.study(), own.bus("B"), FaultKind::three_phase).quantities.ikss_ka, 11, 1e-12));
}

// Each quantity that lacks a figure says so and has no value.
BOOST_AUTO_TEST_CASE(what_lacks_a_figure_is_not_evaluated) {
  const std::string motors = R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
      "buses": [{"id": "B", "nominal_kv": 6}],
      "induction_motors": [{"id": "M", "bus": "B", "rated_mw": 1, "rated_kv": 6, "power_factor": 0.9,
        "efficiency_percent": 95, "locked_rotor_ratio": 6}]})";
  const CaseStudy c(read_text(motors), iec());
  const auto q = solve(c.study(), c.bus("B"), FaultKind::three_phase).quantities;
  BOOST_TEST(q.ikss_ka > 0);
  BOOST_TEST(!q.ib_ka.has_value());
  BOOST_TEST(!q.ith_ka.has_value());  // Ik is 0
  std::map<std::string, std::string> why;
  for (const auto& one : q.not_evaluated) why[one.quantity] = one.why;
  BOOST_TEST(why["Ib"] == "pole_pairs or rated power of motor M");
  BOOST_TEST(why.count("Ith") == 1U);

  StudyOptions late = iec();
  late.iec60909.tmin_s = 0.3;
  const CaseStudy slow(read("cases/eight_node_grid.json"), late);
  const auto beyond = solve(slow.study(), slow.bus("N2"), FaultKind::three_phase).quantities;
  BOOST_TEST(!beyond.idc_ka.has_value());
  BOOST_TEST(beyond.ib_ka.has_value());
}

// Closed form: two converters of 1.2 times rated current behind one line; I"k = c U / (sqrt(3) |Z_ii|) + sum
// |Z_ij| I_j / |Z_ii| and ip adds sqrt(2) I_kPF without kappa (IEC 60909-0:2016, 6.9, from memory).
BOOST_AUTO_TEST_CASE(full_converters_add_by_magnitude) {
  const CaseStudy c(read_text(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "A", "nominal_kv": 20}, {"id": "B", "nominal_kv": 20}],
    "network_feeders": [{"id": "Q", "bus": "A", "max": {"r1_ohm": 0, "x1_ohm": 2}}],
    "lines": [{"id": "L", "from": "A", "to": "B", "length_km": 1, "r1_ohm_per_km": 0, "x1_ohm_per_km": 1}],
    "inverter_sources": [{"id": "W1", "bus": "A", "rated_mva": 10, "rated_kv": 20, "fault_current_ratio": 1.2},
                         {"id": "W2", "bus": "B", "rated_mva": 5, "rated_kv": 20, "fault_current_ratio": 1.2}]})"),
                    iec());
  const auto q = solve(c.study(), c.bus("B"), FaultKind::three_phase).quantities;
  const double i1 = 1.2 * 10 / (std::sqrt(3.0) * 20), i2 = i1 / 2;
  const double converters = (2 * i1 + 3 * i2) / 3;
  const double grid = 1.1 * 20 / std::sqrt(3.0) / 3;
  BOOST_TEST(near(q.converter_ka, converters, 1e-9));
  BOOST_TEST(near(q.ikss_ka, grid + converters, 1e-9));
  BOOST_TEST(near(*q.ip_ka, std::sqrt(2.0) * (2 * grid + converters), 1e-9));
}

// Closed form: Z = sqrt(2) kappa U / (sqrt(3) i_peak), so that kappa sqrt(2) I"k at c = 1 is the maker's
// peak.
BOOST_AUTO_TEST_CASE(doubly_fed_machine_gives_the_peak_of_its_maker) {
  const CaseStudy c(read_text(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
    "buses": [{"id": "A", "nominal_kv": 20}],
    "inverter_sources": [{"id": "D", "bus": "A", "rated_mva": 3, "rated_kv": 20,
      "doubly_fed": {"peak_ka": 0.5, "kappa": 1.7, "r_over_x": 0.1}}]})"),
                    iec());
  const auto q = solve(c.study(), c.bus("A"), FaultKind::three_phase).quantities;
  BOOST_TEST(near(1.7 * std::sqrt(2.0) * q.ikss_ka, 1.1 * 0.5, 1e-12));
}

// Closed form: a machine whose lambda is known, at its own terminals: Ik = lambda Ir; excitation fed from the
// terminals: 0.
BOOST_AUTO_TEST_CASE(steady_state_of_a_machine_at_its_terminals) {
  const auto text = [](const char* extra) {
    return std::string(R"({"format": "kiloamp-case", "version": 1, "frequency_hz": 50,
      "buses": [{"id": "A", "nominal_kv": 10.5}],
      "synchronous_machines": [{"id": "G", "bus": "A", "role": "generator", "rated_mva": 20, "rated_kv": 10.5,
        "power_factor": 0.8, "xd_subtransient_percent": 15, "ra_percent": 0.5)") +
           extra + "}]}";
  };
  const double ir = 20 / (std::sqrt(3.0) * 10.5);
  const CaseStudy known(read_text(text(R"(, "lambda_max": 2.3, "lambda_min": 0.6)")), iec());
  const auto q = solve(known.study(), known.bus("A"), FaultKind::three_phase).quantities;
  BOOST_TEST(near(*q.ik_ka, 2.3 * ir, 1e-9));
  BOOST_TEST(near(*q.n, iec60909::n_factor(q.ikss_ka / *q.ik_ka, 1), 1e-12));
  const CaseStudy fed(read_text(text(R"(, "excitation": "static_terminal_fed")")), iec());
  BOOST_TEST(near(*solve(fed.study(), fed.bus("A"), FaultKind::three_phase).quantities.ik_ka, 0, 1e-9));
}

BOOST_AUTO_TEST_SUITE_END()
