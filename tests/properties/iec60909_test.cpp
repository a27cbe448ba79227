// Laws that IEC 60909-0 obeys on every network.
#include <algorithm>
#include <cmath>

#include "engine/study/study.hpp"
#include "tests/support/near.hpp"
#include "tests/support/random_network.hpp"

using namespace kiloamp;
using namespace kiloamp::test;

BOOST_AUTO_TEST_SUITE(iec60909_laws)

namespace {

struct Row {
  FaultResult result;
  iec60909::Quantities q;
};

StudyOptions iec(CaseKind kind, iec60909::KappaMethod kappa = iec60909::KappaMethod::c) {
  StudyOptions options;
  options.method = Method::iec60909;
  options.case_kind = kind;
  options.iec60909.kappa = kappa;
  return options;
}

std::vector<Row> rows(Network network, const StudyOptions& options) {
  for (SynchronousMachine& m : network.synchronous_machines)
    if (!m.power_factor) m.power_factor = 0.85;
  const Study study(std::move(network), options);
  std::vector<Row> all;
  study.for_each_fault([&](const StudiedFault& fault) { all.push_back({fault.result, *fault.iec60909}); });
  return all;
}

// Lines and feeders of one R/X.
Network one_angle(std::uint32_t seed) {
  Network n = random_network(seed);
  for (Line& line : n.lines) line.r1_ohm_per_km = 0.3 * line.x1_ohm_per_km;
  for (NetworkFeeder& f : n.network_feeders)
    for (FeederLevel* level : {&f.max, f.min ? &*f.min : &f.max}) {
      *level = FeederLevel{};
      level->r1_ohm = 0.6;
      level->x1_ohm = 2;
    }
  n.synchronous_machines.clear();
  n.induction_motors.clear();
  n.power_station_units.clear();
  n.transformers.clear();
  n.three_winding_transformers.clear();
  n.series_reactors.clear();
  n.scenarios.clear();
  return n;
}

}  // namespace

BOOST_AUTO_TEST_CASE(largest_is_never_below_smallest) {
  std::size_t compared = 0;
  for (std::uint32_t seed = 1; seed <= 150; ++seed) {
    // The correction factor of a machine whose rated voltage is far below nominal may take more than c adds.
    Network n = random_network(seed);
    for (SynchronousMachine& m : n.synchronous_machines)
      m.rated_kv = std::max(m.rated_kv, n.bus(m.bus).nominal_kv);
    const auto most = rows(n, iec(CaseKind::max)), least = rows(n, iec(CaseKind::min));
    BOOST_REQUIRE(most.size() == least.size());
    for (std::size_t i = 0; i < most.size(); ++i) {
      // Where only line capacitance closes the zero sequence, less inductance in series with it means less
      // current.
      const auto capacitive = [](const Row& row) {
        return row.result.z0_ohm && row.result.z0_ohm->imag() < 0;
      };
      const bool earth = most[i].result.fault.kind == FaultKind::line_to_ground ||
                         most[i].result.fault.kind == FaultKind::double_line_to_ground;
      if (earth && (capacitive(most[i]) || capacitive(least[i]))) continue;
      // The factors of the pairs of a three-winding transformer differ; an arm of its zero-sequence star is a
      // difference of pairs and may grow by more than c.
      if (earth && !n.three_winding_transformers.empty()) continue;
      BOOST_TEST(most[i].q.ikss_ka >= least[i].q.ikss_ka * (1 - 1e-12),
                 "seed " << seed << ", bus " << n.bus(most[i].result.fault.bus).id << ", kind "
                         << static_cast<int>(most[i].result.fault.kind));
      ++compared;
    }
  }
  BOOST_TEST(compared > 2000U);
}

BOOST_AUTO_TEST_CASE(breaking_current_is_never_above_the_initial_one) {
  std::size_t below = 0;
  for (std::uint32_t seed = 1; seed <= 150; ++seed)
    for (const Row& row : rows(random_network(seed), iec(CaseKind::max))) {
      if (!row.q.ib_ka) continue;
      BOOST_TEST(*row.q.ib_ka <= row.q.ikss_ka);
      if (*row.q.ib_ka < 0.99 * row.q.ikss_ka) ++below;
    }
  BOOST_TEST(below > 20U);
}

BOOST_AUTO_TEST_CASE(far_from_machines_nothing_decays) {
  for (std::uint32_t seed = 1; seed <= 60; ++seed) {
    Network n = random_network(seed);
    n.induction_motors.clear();
    // Machines a hundred times as large in MVA with the same ohms are far from every fault.
    for (SynchronousMachine& m : n.synchronous_machines) {
      m.rated_mva *= 100;
      m.xd_subtransient_percent *= 100;
      if (m.x2_percent) *m.x2_percent *= 100;
      if (m.ra_percent) *m.ra_percent *= 100;
      m.power_factor = 1;
      m.excitation.reset();
      m.lambda_max.reset();
    }
    n.power_station_units.clear();
    for (const Row& row : rows(n, iec(CaseKind::max))) {
      if (row.q.ikss_ka == 0) continue;
      BOOST_TEST(near(*row.q.ib_ka, row.q.ikss_ka, 1e-9 * row.q.ikss_ka));
      BOOST_TEST(near(*row.q.ik_ka, row.q.ikss_ka, 1e-9 * row.q.ikss_ka));
    }
  }
}

BOOST_AUTO_TEST_CASE(method_c_lies_between_the_bounds_of_the_network) {
  std::size_t compared = 0;
  for (std::uint32_t seed = 1; seed <= 60; ++seed) {
    Network n = one_angle(seed);
    double low = 1e9, high = 0;
    std::uint32_t k = seed;
    for (Line& line : n.lines) {
      line.r1_ohm_per_km = line.x1_ohm_per_km * (0.1 + 0.05 * (k++ % 9));
      low = std::min(low, line.r1_ohm_per_km / line.x1_ohm_per_km);
      high = std::max(high, line.r1_ohm_per_km / line.x1_ohm_per_km);
    }
    low = std::min(low, 0.3);
    high = std::max(high, 0.3);  // the feeders'
    for (const Row& row : rows(n, iec(CaseKind::max))) {
      if (!row.q.r_over_x) continue;
      ++compared;
      BOOST_TEST((*row.q.r_over_x >= low * (1 - 1e-9) && *row.q.r_over_x <= high * (1 + 1e-9)),
                 "seed " << seed);
    }
  }
  BOOST_TEST(compared > 500U);
}

BOOST_AUTO_TEST_CASE(raising_an_impedance_of_a_network_of_one_angle_never_raises_a_current) {
  std::size_t compared = 0;
  for (std::uint32_t seed = 1; seed <= 60; ++seed) {
    const Network n = one_angle(seed);
    const auto before = rows(n, iec(CaseKind::max));
    for (std::size_t i = 0; i < n.lines.size(); ++i) {
      Network raised = n;
      raised.lines[i].length_km *= 1.7;
      const auto after = rows(raised, iec(CaseKind::max));
      for (std::size_t r = 0; r < before.size(); ++r) {
        if (before[r].result.fault.kind != FaultKind::three_phase) continue;
        ++compared;
        BOOST_TEST(after[r].q.ikss_ka <= before[r].q.ikss_ka * (1 + 1e-12),
                   "seed " << seed << ", line " << i);
      }
    }
  }
  BOOST_TEST(compared > 500U);
}

BOOST_AUTO_TEST_CASE(scaling_all_impedances_scales_currents_inversely) {
  for (std::uint32_t seed = 1; seed <= 60; ++seed) {
    Network n = random_network(seed);
    n.synchronous_machines.clear();
    n.transformers.clear();  // their factor follows their own impedance
    n.three_winding_transformers.clear();
    n.power_station_units.clear();
    n.scenarios.clear();
    const auto before = rows(n, iec(CaseKind::max));
    Network scaled = n;
    const double factor = 2.5;
    for (Line& line : scaled.lines) {
      line.length_km *= factor;
      for (auto* b : {&line.b0_us_per_km, &line.b1_us_per_km})
        if (*b) **b /= factor * factor;
    }
    for (MutualCoupling& m : scaled.mutual_couplings) m.length_km *= factor;
    for (NetworkFeeder& f : scaled.network_feeders)
      for (FeederLevel* level : {&f.max, f.min ? &*f.min : nullptr}) {
        if (level == nullptr) continue;
        for (auto* value : {&level->three_phase_ka, &level->three_phase_mva, &level->line_to_ground_ka,
                            &level->line_to_ground_mva})
          if (*value) **value /= factor;
        for (auto* value :
             {&level->r1_ohm, &level->x1_ohm, &level->r2_ohm, &level->x2_ohm, &level->r0_ohm, &level->x0_ohm})
          if (*value) **value *= factor;
      }
    for (InductionMotor& m : scaled.induction_motors)
      m.locked_rotor_ratio = m.locked_rotor_ratio.value_or(m.rated_kv <= 1 ? 5 : 6) / factor;
    for (SeriesReactor& r : scaled.series_reactors)
      for (auto* value : {&r.x_ohm, &r.r_ohm, &r.x_percent})
        if (*value) **value *= factor;
    for (EarthingTransformer& e : scaled.earthing_transformers) {
      e.r0_ohm *= factor;
      e.x0_ohm *= factor;
      if (!e.neutral) continue;
      for (auto* value : {&e.neutral->r_ohm, &e.neutral->x_ohm})
        if (*value) **value *= factor;
    }
    for (Shunt& s : scaled.shunts) s.mvar /= factor;
    const auto after = rows(scaled, iec(CaseKind::max));
    for (std::size_t r = 0; r < before.size(); ++r)
      BOOST_TEST(near(after[r].q.ikss_ka * factor, before[r].q.ikss_ka, 1e-8 * (1 + before[r].q.ikss_ka)),
                 "seed " << seed);
  }
}

BOOST_AUTO_TEST_CASE(the_other_kappa_methods_stay_within_their_limits) {
  for (std::uint32_t seed = 1; seed <= 60; ++seed) {
    const Network n = random_network(seed);
    const auto a = rows(n, iec(CaseKind::max, iec60909::KappaMethod::a)),
               b = rows(n, iec(CaseKind::max, iec60909::KappaMethod::b));
    for (std::size_t r = 0; r < a.size(); ++r) {
      if (!a[r].q.kappa || !b[r].q.kappa) continue;
      const bool lv = n.bus(a[r].result.fault.bus).nominal_kv <= 1;
      BOOST_TEST(*a[r].q.kappa <= 2.0);
      BOOST_TEST(*b[r].q.kappa <= std::max(lv ? 1.8 : 2.0, iec60909::kappa(*b[r].q.r_over_x)));
      BOOST_TEST(*b[r].q.kappa >= iec60909::kappa(*b[r].q.r_over_x) * (1 - 1e-12) - (lv ? 0.2 : 0));
    }
  }
}

BOOST_AUTO_TEST_SUITE_END()
