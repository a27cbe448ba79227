#include "engine/phase/element_matrices.hpp"

#include <Eigen/LU>
#include <algorithm>
#include <cmath>

namespace kiloamp::phase {

namespace {

const Complex kA(-0.5, std::sqrt(3.0) / 2);

bool live(const Network& n, const Element& e, std::initializer_list<BusIndex> buses) {
  return e.is_in_service() &&
         std::all_of(buses.begin(), buses.end(), [&](BusIndex b) { return n.buses[at(b)].is_in_service(); });
}

Complex magnitude_and_ratio(double size, double x_over_r) {
  const double r = size / std::sqrt(1 + x_over_r * x_over_r);
  return {r, r * x_over_r};
}

Matrix3 inverse_of(Complex z0, Complex z1, Complex z2) { return cyclic(1.0 / z0, 1.0 / z1, 1.0 / z2); }

ShuntElement feeder(const Network& n, std::uint32_t i) {
  const NetworkFeeder& f = n.network_feeders[i];
  const FeederLevel& l = n.feeder_state == FeederState::min && f.min ? *f.min : f.max;
  const double kv = n.buses[at(f.bus)].nominal_kv;
  Complex z1, z2;
  std::optional<Complex> z0;
  if (l.x1_ohm) {
    z1 = {l.r1_ohm.value_or(0), *l.x1_ohm};
    z2 = {l.r2_ohm.value_or(z1.real()), l.x2_ohm.value_or(z1.imag())};
    if (l.x0_ohm) z0 = Complex(l.r0_ohm.value_or(0), *l.x0_ohm);
  } else {
    const double driving = l.voltage_factor.value_or(1);  // voltage behind the levels, pu of nominal
    const double mva = l.three_phase_mva ? *l.three_phase_mva : std::sqrt(3.0) * kv * *l.three_phase_ka;
    z1 = magnitude_and_ratio(driving * kv * kv / mva, *l.x_over_r);
    z2 = z1 * l.z2_over_z1.value_or(1);
    if (l.x0_over_x1) z0 = Complex(l.r0_over_x0.value_or(0), 1) * (*l.x0_over_x1 * z1.imag());
    if (l.line_to_ground_ka || l.line_to_ground_mva) {
      double ka = l.line_to_ground_ka.value_or(0);
      if (l.line_to_ground_mva) {
        ka = *l.line_to_ground_mva / (std::sqrt(3.0) * kv);
        if (l.line_to_ground_mva_basis == EarthFaultMvaBasis::single_phase) ka *= 3;
      }
      // Bisection on |Z0|: the size of the sum grows with it beyond the sum's nearest point to 0.
      const double want = driving * std::sqrt(3.0) * kv / ka;
      const Complex unit = magnitude_and_ratio(1, l.x0_over_r0.value_or(*l.x_over_r));
      double low = 0, high = 2 * (want + std::abs(z1 + z2));
      for (int step = 0; step < 200; ++step) {
        const double middle = (low + high) / 2;
        (std::abs(z1 + z2 + middle * unit) < want ? low : high) = middle;
      }
      z0 = low * unit;
    }
  }
  return {{ElementKind::network_feeder, i},
          f.bus,
          cyclic(z0 ? 1.0 / *z0 : 0, 1.0 / z1, 1.0 / z2),
          z0.has_value(),
          true};
}

std::optional<Complex> star_to_earth(const std::optional<Neutral>& neutral) {
  if (!neutral || neutral->grounding == Grounding::open) return std::nullopt;
  return neutral->grounding == Grounding::solid
             ? Complex(0)
             : Complex(neutral->r_ohm.value_or(0), neutral->x_ohm.value_or(0));
}

ShuntElement machine(const Network& n, std::uint32_t i) {
  const SynchronousMachine& m = n.synchronous_machines[i];
  const double ohm = m.rated_kv * m.rated_kv / m.rated_mva;
  const double r = (m.ra_percent ? *m.ra_percent : m.xd_subtransient_percent / *m.x_over_r) / 100;
  const auto z = [&](double x_percent) { return ohm * Complex(r, x_percent / 100); };
  const auto star = star_to_earth(m.neutral);
  const Complex y0 = star ? 1.0 / (z(m.x0_percent.value_or(0)) + 3.0 * *star) : 0;
  return {{ElementKind::synchronous_machine, i},
          m.bus,
          cyclic(y0, 1.0 / z(m.xd_subtransient_percent), 1.0 / z(*m.x2_percent)),
          star.has_value(),
          true};
}

ShuntElement motor(const Network& n, std::uint32_t i) {
  const InductionMotor& m = n.induction_motors[i];
  double mva = m.rated_mva.value_or(0);
  if (!m.rated_mva) {
    const double mw = m.rated_mw   ? *m.rated_mw
                      : m.rated_kw ? *m.rated_kw / 1e3
                                   : *m.rated_hp * 0.745699872e-3;
    mva = mw / *m.power_factor / (*m.efficiency_percent / 100);
  }
  const double size = m.rated_kv * m.rated_kv / (mva * m.count.value_or(1) * *m.locked_rotor_ratio);
  const double x = size / std::sqrt(1 + *m.r_over_x * *m.r_over_x);
  const Complex y = 1.0 / Complex(*m.r_over_x * x, x);
  return {{ElementKind::induction_motor, i}, m.bus, cyclic(0, y, y), false, true};
}

}  // namespace

Matrix3 cyclic(Complex m0, Complex m1, Complex m2) {
  // Entry (p, q) depends on q - p: sum of m_s times the eigenvector's turn over that step, over 3.
  Matrix3 m;
  const Complex step1 = kA,
                step2 =
                    kA *
                    kA;  // from one phase to the next, read backwards: x_p = a^2 x_(p-1) in positive sequence
  for (int p = 0; p < 3; ++p)
    for (int q = 0; q < 3; ++q) {
      const int d = (q - p + 3) % 3;
      const Complex turn1 = d == 0 ? 1.0 : d == 1 ? step1 : step2;
      m(p, q) = (m0 + m1 * turn1 + m2 * std::conj(turn1)) / 3.0;
    }
  return m;
}

std::vector<ShuntElement> shunt_elements(const Network& n, bool include_shunts) {
  std::vector<ShuntElement> all;
  for (std::uint32_t i = 0; i < n.network_feeders.size(); ++i)
    if (live(n, n.network_feeders[i], {n.network_feeders[i].bus})) all.push_back(feeder(n, i));
  for (std::uint32_t i = 0; i < n.synchronous_machines.size(); ++i)
    if (live(n, n.synchronous_machines[i], {n.synchronous_machines[i].bus})) all.push_back(machine(n, i));
  for (std::uint32_t i = 0; i < n.induction_motors.size(); ++i)
    if (live(n, n.induction_motors[i], {n.induction_motors[i].bus}) &&
        n.induction_motors[i].drives_fault_current())
      all.push_back(motor(n, i));
  for (std::uint32_t i = 0; i < n.inverter_sources.size(); ++i) {
    const InverterSource& source = n.inverter_sources[i];
    if (!live(n, source, {source.bus}) || !source.doubly_fed) continue;
    const DoublyFed& d = *source.doubly_fed;
    const double size = std::sqrt(2.0 / 3.0) * d.kappa.value_or(1.7) * source.rated_kv / d.peak_ka;
    const double x = size / std::sqrt(1 + d.r_over_x * d.r_over_x);
    const Complex y = 1.0 / Complex(d.r_over_x * x, x);
    all.push_back({{ElementKind::inverter_source, i}, source.bus, cyclic(0, y, y), false, true});
  }
  for (std::uint32_t i = 0; i < n.earthing_transformers.size(); ++i) {
    const EarthingTransformer& e = n.earthing_transformers[i];
    const auto star = star_to_earth(e.neutral);
    if (!live(n, e, {e.bus}) || !star) continue;
    all.push_back({{ElementKind::earthing_transformer, i},
                   e.bus,
                   cyclic(1.0 / (Complex(e.r0_ohm, e.x0_ohm) + 3.0 * *star), 0, 0),
                   true,
                   false});
  }
  for (std::uint32_t i = 0; i < n.shunts.size(); ++i) {
    const Shunt& s = n.shunts[i];
    const bool grounded = s.grounded.value_or(false);
    if (!live(n, s, {s.bus}) || (!grounded && !include_shunts)) continue;
    const Complex y(0, s.mvar / (s.rated_kv * s.rated_kv));
    all.push_back({{ElementKind::shunt, i},
                   s.bus,
                   cyclic(grounded ? y : 0, include_shunts ? y : 0, include_shunts ? y : 0),
                   grounded,
                   false});
  }
  return all;
}

namespace {

void put_series(BranchElement& b, Eigen::Index pair, const Eigen::MatrixXcd& y, Eigen::Index row,
                Eigen::Index column, Eigen::Index other_pair) {
  const Matrix3 block = y.block<3, 3>(3 * row, 3 * column);
  for (int end = 0; end < 2; ++end)
    for (int other = 0; other < 2; ++other)
      b.admittance.block<3, 3>(6 * pair + 3 * end, 6 * other_pair + 3 * other) +=
          (end == other ? 1.0 : -1.0) * block;
}

// Lines that couplings hang together, by walking from each line over the couplings.
std::vector<std::vector<std::uint32_t>> coupled_groups(const Network& n, const std::vector<bool>& stays) {
  std::vector<int> group(n.lines.size(), -1);
  std::vector<std::vector<std::uint32_t>> groups;
  for (std::uint32_t start = 0; start < n.lines.size(); ++start) {
    if (!stays[start] || group[start] >= 0) continue;
    std::vector<std::uint32_t> members{start};
    group[start] = static_cast<int>(groups.size());
    for (std::size_t k = 0; k < members.size(); ++k)
      for (const MutualCoupling& c : n.mutual_couplings) {
        if (!c.is_in_service() || (c.line_a != members[k] && c.line_b != members[k])) continue;
        const std::uint32_t other = c.line_a == members[k] ? c.line_b : c.line_a;
        if (!stays[other] || group[other] >= 0) continue;
        group[other] = group[start];
        members.push_back(other);
      }
    groups.push_back(members);
  }
  return groups;
}

}  // namespace

std::vector<BranchElement> branch_elements(const Network& n, bool include_shunts) {
  std::vector<BranchElement> all;
  std::vector<bool> in(n.lines.size()), stays(n.lines.size());
  for (std::size_t i = 0; i < n.lines.size(); ++i) {
    in[i] = live(n, n.lines[i], {n.lines[i].from, n.lines[i].to});
    stays[i] = in[i] || n.lines[i].earthed_when_out.value_or(false);
  }
  for (const auto& members : coupled_groups(n, stays)) {
    const auto m = static_cast<Eigen::Index>(members.size());
    Eigen::MatrixXcd z = Eigen::MatrixXcd::Zero(3 * m, 3 * m);
    for (Eigen::Index k = 0; k < m; ++k) {
      const Line& l = n.lines[members[static_cast<std::size_t>(k)]];
      const double scale = l.length_km / l.parallel.value_or(1);
      const Complex z1 = scale * Complex(l.r1_ohm_per_km, l.x1_ohm_per_km);
      z.block<3, 3>(3 * k, 3 * k) = cyclic(scale * Complex(*l.r0_ohm_per_km, *l.x0_ohm_per_km), z1, z1);
      for (Eigen::Index j = 0; j < m; ++j)
        for (const MutualCoupling& c : n.mutual_couplings)
          if (c.is_in_service() && c.line_a == members[static_cast<std::size_t>(k)] &&
              c.line_b == members[static_cast<std::size_t>(j)]) {
            const Matrix3 mutual = cyclic(
                c.orientation.value_or(1) * c.length_km * Complex(c.r0m_ohm_per_km, c.x0m_ohm_per_km), 0, 0);
            z.block<3, 3>(3 * k, 3 * j) += mutual;
            z.block<3, 3>(3 * j, 3 * k) += mutual;
          }
    }
    const Eigen::MatrixXcd y = z.inverse();
    BranchElement b;
    std::vector<Eigen::Index> kept;
    for (Eigen::Index k = 0; k < m; ++k)
      if (in[members[static_cast<std::size_t>(k)]]) kept.push_back(k);
    if (kept.empty()) continue;
    b.admittance = Eigen::MatrixXcd::Zero(static_cast<Eigen::Index>(6 * kept.size()),
                                          static_cast<Eigen::Index>(6 * kept.size()));
    for (std::size_t p = 0; p < kept.size(); ++p) {
      const std::uint32_t index = members[static_cast<std::size_t>(kept[p])];
      const Line& l = n.lines[index];
      b.ends.push_back({{ElementKind::line, index}, l.from});
      b.ends.push_back({{ElementKind::line, index}, l.to});
      for (std::size_t q = 0; q < kept.size(); ++q)
        put_series(b, static_cast<Eigen::Index>(p), y, kept[p], kept[q], static_cast<Eigen::Index>(q));
      const double scale = 0.5e-6 * l.length_km * l.parallel.value_or(1);
      const Complex y0(0, scale * l.b0_us_per_km.value_or(0)),
          y1(0, include_shunts ? scale * l.b1_us_per_km.value_or(0) : 0);
      for (int end = 0; end < 2; ++end) {
        const auto at_end = static_cast<Eigen::Index>(6 * p + 3 * static_cast<std::size_t>(end));
        b.admittance.block<3, 3>(at_end, at_end) += cyclic(y0, y1, y1);
      }
      b.charged.push_back(y0 != Complex(0));
    }
    all.push_back(std::move(b));
  }
  for (std::uint32_t i = 0; i < n.series_reactors.size(); ++i) {
    const SeriesReactor& r = n.series_reactors[i];
    if (!live(n, r, {r.from, r.to})) continue;
    const double x =
        r.x_ohm ? *r.x_ohm : *r.x_percent / 100 * *r.rated_kv / std::sqrt(3.0) / (*r.rated_a / 1000);
    const Complex z(r.r_ohm.value_or(0), x);
    BranchElement b;
    b.ends = {{{ElementKind::series_reactor, i}, r.from}, {{ElementKind::series_reactor, i}, r.to}};
    b.charged = {false};
    b.admittance = Eigen::MatrixXcd::Zero(6, 6);
    put_series(b, 0, inverse_of(z, z, z), 0, 0, 0);
    all.push_back(std::move(b));
  }
  return all;
}

}  // namespace kiloamp::phase
