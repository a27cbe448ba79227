#include "engine/phase/phase_network.hpp"

#include <Eigen/QR>
#include <Eigen/SparseLU>
#include <cmath>
#include <stdexcept>

#include "engine/phase/phase_equations.hpp"

namespace kiloamp::phase {

namespace {
// Against the largest term of each row's sum.
constexpr double kLargestResidual = 1e-7;
const Complex kA(-0.5, std::sqrt(3.0) / 2);
}  // namespace

struct PhaseNetwork::Body {
  Body(const Network& network, bool include_shunts)
      : equations(network, include_shunts), buses(network.buses.size()) {
    for (std::uint32_t i = 0; i < network.switches.size(); ++i) {
      const BusSwitch& s = network.switches[i];
      if (s.closed && s.is_in_service() && equations.node(s.from) >= 0 && equations.node(s.to) >= 0)
        switches.push_back({i, s.from, s.to});
    }
    if (equations.matrix().rows() == 0) return;
    lu.compute(equations.matrix());
    if (lu.info() != Eigen::Success) throw std::runtime_error("the phase-coordinate equations are singular");
  }

  struct Closed {
    std::uint32_t index;
    BusIndex from, to;
  };
  PhaseEquations equations;
  std::size_t buses;
  std::vector<Closed> switches;
  Eigen::SparseLU<SparseMatrix> lu;

  [[nodiscard]] Eigen::VectorXcd respond(Eigen::Index row) const {
    Eigen::VectorXcd injection = Eigen::VectorXcd::Zero(equations.matrix().rows());
    injection[row] = 1;
    return lu.solve(injection);
  }
  void add_switch_currents(const PhaseFault& fault, const Eigen::VectorXcd& x, PhaseSolution& solution) const;
};

PhaseNetwork::PhaseNetwork(const Network& prepared, bool include_shunts)
    : body_(std::make_unique<Body>(prepared, include_shunts)) {}
PhaseNetwork::~PhaseNetwork() = default;

// Unknowns: the faulted phases' currents, the potential of a floating common point, and where the bus's
// section hangs on a pin the current that takes the pin's tie away.
PhaseSolution PhaseNetwork::solve(const PhaseFault& fault) const {
  const PhaseEquations& eq = body_->equations;
  const Phases prefault{fault.prefault_ln_kv, fault.prefault_ln_kv * kA * kA, fault.prefault_ln_kv * kA};
  std::vector<int> phases;
  std::vector<Eigen::VectorXcd> response;
  for (int p = 0; p < 3; ++p)
    if (fault.faulted[static_cast<std::size_t>(p)]) {
      phases.push_back(p);
      response.push_back(body_->respond(eq.row(fault.bus, p)));
    }
  const int pin = fault.earthed ? eq.pin_of(fault.bus) : -1;
  const auto count = static_cast<Eigen::Index>(phases.size());
  const Eigen::Index size = count + (fault.earthed ? 0 : 1) + (pin >= 0 ? 1 : 0);
  Eigen::MatrixXcd a = Eigen::MatrixXcd::Zero(size, size);
  Eigen::VectorXcd b = Eigen::VectorXcd::Zero(size);
  Eigen::VectorXcd untie;
  if (pin >= 0) {
    Eigen::VectorXcd injection = Eigen::VectorXcd::Zero(eq.matrix().rows());
    injection.segment<3>(3 * pin).setOnes();
    untie = body_->lu.solve(injection);
  }
  for (Eigen::Index i = 0; i < count; ++i) {
    const Eigen::Index row = eq.row(fault.bus, phases[static_cast<std::size_t>(i)]);
    for (Eigen::Index k = 0; k < count; ++k)
      a(i, k) = response[static_cast<std::size_t>(k)][row] + (fault.earthed ? fault.earth_impedance_ohm : 0);
    a(i, i) += fault.phase_impedance_ohm;
    b[i] = prefault[static_cast<std::size_t>(phases[static_cast<std::size_t>(i)])];
    if (!fault.earthed) {
      a(i, count) = 1;
      a(count, i) = 1;
    }
    if (pin >= 0) {
      a(i, size - 1) = -untie[row];
      a(size - 1, i) = response[static_cast<std::size_t>(i)].segment<3>(3 * pin).sum();
    }
  }
  const Eigen::VectorXcd solved = a.fullPivHouseholderQr().solve(b);
  Eigen::VectorXcd x = Eigen::VectorXcd::Zero(eq.matrix().rows());
  PhaseSolution solution;
  for (Eigen::Index i = 0; i < count; ++i) {
    x -= solved[i] * response[static_cast<std::size_t>(i)];
    solution.fault_current_ka[static_cast<std::size_t>(phases[static_cast<std::size_t>(i)])] = solved[i];
  }
  if (pin >= 0) x += solved[size - 1] * untie;

  Eigen::VectorXcd residual = eq.matrix() * x;
  for (int p = 0; p < 3; ++p)
    residual[eq.row(fault.bus, p)] += solution.fault_current_ka[static_cast<std::size_t>(p)];
  if (pin >= 0) residual.segment<3>(3 * pin).array() -= solved[size - 1];
  const Eigen::VectorXd scale = eq.matrix().cwiseAbs() * x.cwiseAbs().cast<Complex>().real();
  for (Eigen::Index r = 0; r < residual.size(); ++r)
    if (!(std::abs(residual[r]) <= kLargestResidual * (scale[r] + fault.prefault_ln_kv)))
      throw std::runtime_error("the phase-coordinate solution does not satisfy its equations");

  solution.contributions = eq.currents_into(fault.bus, x);
  body_->add_switch_currents(fault, x, solution);
  solution.voltage_change_kv.resize(body_->buses);
  for (std::size_t bus = 0; bus < body_->buses; ++bus)
    if (eq.node(static_cast<BusIndex>(bus)) >= 0)
      for (int p = 0; p < 3; ++p)
        solution.voltage_change_kv[bus][static_cast<std::size_t>(p)] =
            x[eq.row(static_cast<BusIndex>(bus), p)];
  return solution;
}

// Currents of closed switches: least squares of the balance at every bus of the group; the smallest of all
// solutions, which is that of equal small resistances.
void PhaseNetwork::Body::add_switch_currents(const PhaseFault& fault, const Eigen::VectorXcd& x,
                                             PhaseSolution& solution) const {
  std::vector<const Closed*> group;
  std::vector<BusIndex> members{fault.bus};
  const auto position = [&](BusIndex bus) {
    for (std::size_t m = 0; m < members.size(); ++m)
      if (members[m] == bus) return static_cast<Eigen::Index>(m);
    members.push_back(bus);
    return static_cast<Eigen::Index>(members.size() - 1);
  };
  for (const Closed& s : switches)
    if (equations.node(s.from) == equations.node(fault.bus)) {
      group.push_back(&s);
      position(s.from);
      position(s.to);
    }
  if (group.empty()) return;
  const auto rows = static_cast<Eigen::Index>(members.size()),
             columns = static_cast<Eigen::Index>(group.size());
  Eigen::MatrixXcd balance = Eigen::MatrixXcd::Zero(rows, columns), into = Eigen::MatrixXcd::Zero(rows, 3);
  for (Eigen::Index c = 0; c < columns; ++c) {  // current from `from` to `to`
    balance(position(group[static_cast<std::size_t>(c)]->from), c) = 1;
    balance(position(group[static_cast<std::size_t>(c)]->to), c) = -1;
  }
  for (Eigen::Index m = 0; m < rows; ++m)
    for (const PhaseContribution& contribution :
         equations.currents_into(members[static_cast<std::size_t>(m)], x))
      for (int p = 0; p < 3; ++p) into(m, p) += contribution.current_ka[static_cast<std::size_t>(p)];
  for (int p = 0; p < 3; ++p) into(0, p) -= solution.fault_current_ka[static_cast<std::size_t>(p)];
  const Eigen::MatrixXcd currents = balance.completeOrthogonalDecomposition().solve(into);
  for (Eigen::Index c = 0; c < columns; ++c) {
    const Closed& s = *group[static_cast<std::size_t>(c)];
    if (s.from != fault.bus && s.to != fault.bus) continue;
    const double towards = s.to == fault.bus ? 1 : -1;
    PhaseContribution contribution{{ElementKind::bus_switch, s.index}, fault.bus, {}};
    for (int p = 0; p < 3; ++p)
      contribution.current_ka[static_cast<std::size_t>(p)] = towards * currents(c, p);
    solution.contributions.push_back(contribution);
  }
}

}  // namespace kiloamp::phase
