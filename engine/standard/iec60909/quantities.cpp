#include "engine/standard/iec60909/quantities.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <limits>
#include <map>
#include <span>

#include "engine/sparse/run_tasks.hpp"

namespace kiloamp::iec60909 {

namespace {

constexpr double kEquivalentFrequency = 0.4;  // 20 Hz of 50, 24 Hz of 60
constexpr double kFarRatio = 2;               // I"k / Ir up to which a machine is far
constexpr double kNearRatio = 1.25;           // I"k / Ik from which the formula of n is meant; below it n = 1
constexpr double kLimitLv = 1.8, kLimitHv = 2.0;
constexpr std::size_t kAtPeak = 0, kNoMotors = 1, kAtDc = 2;

double root2() { return std::sqrt(2.0); }

// MW of one motor; empty when the case does not say.
std::optional<double> one_motor_mw(const InductionMotor& m) {
  if (m.rated_mw) return *m.rated_mw;
  if (m.rated_kw) return *m.rated_kw / 1000;
  if (m.rated_hp) return *m.rated_hp * 0.745699872e-3;
  if (m.power_factor && m.efficiency_percent)
    return *m.rated_mva * *m.power_factor * *m.efficiency_percent / 100;
  return std::nullopt;
}

double real_power_mw(const InductionMotor& m) {
  return m.count.value_or(1) * one_motor_mw(m).value_or(m.rated_mva.value_or(0));
}

}  // namespace

Evaluation::Evaluation(const Network& corrected, const FaultSolver& solver, const Options& options,
                       CaseKind kind, int threads)
    : network_(&corrected), solver_(&solver), options_(options), kind_(kind) {
  const SequenceModel& model = solver.model();
  for (std::size_t i = 0; i <= options.parting_s.size(); ++i) {
    const auto ratio =
        dc_frequency_ratio(corrected.frequency_hz, i == 0 ? options.tmin_s : options.parting_s[i - 1]);
    if (ratio && std::find(dc_ratios_.begin(), dc_ratios_.end(), *ratio) == dc_ratios_.end())
      dc_ratios_.push_back(*ratio);
  }
  build_companions(threads);
  collect_machines();
  std::vector<double> e_pu(model.node_count(), 1.0);
  for (std::size_t n = 0; n < e_pu.size(); ++n)
    e_pu[n] = solver.prefault_pu(model.buses_of(static_cast<Node>(n)).front());
  std::vector<SourcePlace> places;
  for (const Machine& m : machines_)
    places.push_back({m.node, m.drive ? 0 : kFarRatio * m.rated_pu / std::abs(m.y_pu)});
  near_.emplace(solver, places, e_pu, threads);
  find_converters();
  if (options.kappa != KappaMethod::c) find_branch_ratios();
  judge_motor_rules();
}

void Evaluation::build_companions(int threads) {
  const Network& n = *network_;
  std::vector<SequenceModel> models(kAtDc + dc_ratios_.size());
  sparse::run_tasks(static_cast<int>(models.size()), threads, [&](int task, int) {
    const auto which = static_cast<std::size_t>(task);
    if (which == kNoMotors) {
      Network still = n;
      for (InductionMotor& m : still.induction_motors) m.in_service = false;
      models[which] = build_sequence_model(still);
    } else {
      const bool peak = which == kAtPeak;
      models[which] = build_sequence_model(
          at_frequency(n, peak ? kEquivalentFrequency : dc_ratios_[which - kAtDc], peak));
    }
  });
  constexpr std::size_t kMost = CompanionNetworks::kMost;
  for (std::size_t first = 0; first < models.size(); first += kMost) {
    const auto some = std::span(models).subspan(first, std::min(kMost, models.size() - first));
    if (first == 0)
      companions_.emplace(*solver_, some, threads);
    else
      dc_companions_.emplace_back(*solver_, some, threads);
  }
}

std::optional<Complex> Evaluation::dc_impedance_pu(double ratio, BusIndex bus) const {
  const auto which =
      static_cast<std::size_t>(std::find(dc_ratios_.begin(), dc_ratios_.end(), ratio) - dc_ratios_.begin());
  assert(which < dc_ratios_.size());
  if (which == 0) return companions_->impedance_pu(kAtDc, bus);
  return dc_companions_[(which - 1) / CompanionNetworks::kMost].impedance_pu(
      (which - 1) % CompanionNetworks::kMost, bus);
}

void Evaluation::collect_machines() {
  const SequenceModel& model = solver_->model();
  const Network& n = *network_;
  machines_at_node_.resize(model.node_count());
  const auto add = [&](Machine m, double mva, double rated_kv, Complex z_ohm) {
    m.node = model.node_of_bus[at(m.bus)];
    m.y_pu = model.base_ohm(m.bus) / z_ohm;
    m.rated_ka = mva / (std::sqrt(3.0) * rated_kv);
    m.rated_pu = m.rated_ka / model.base_ka(m.bus);
    machines_at_node_[at(m.node)].push_back(static_cast<std::uint32_t>(machines_.size()));
    machines_.push_back(m);
  };
  for (std::uint32_t i = 0; i < n.synchronous_machines.size(); ++i) {
    const SynchronousMachine& m = n.synchronous_machines[i];
    if (!is_live(n, m, m.bus)) continue;
    add({{ElementKind::synchronous_machine, i}, m.bus}, m.rated_mva, m.rated_kv,
        *machine_impedance_ohm(m)[kPositive]);
  }
  for (std::uint32_t i = 0; i < n.induction_motors.size(); ++i) {
    const InductionMotor& m = n.induction_motors[i];
    if (!is_live(n, m, m.bus) || !m.drives_fault_current()) continue;
    Machine machine{{ElementKind::induction_motor, i}, m.bus};
    machine.motor = true;
    machine.drive = m.converter_fed.value_or(false);
    const auto mw = one_motor_mw(m);
    if (mw && m.pole_pairs) machine.mw_per_pole_pair = *mw / *m.pole_pairs;
    add(machine, motor_rated_mva(m), m.rated_kv, *motor_impedance_ohm(m)[kPositive]);
  }
}

void Evaluation::find_converters() {
  const SequenceModel& model = solver_->model();
  struct Source {
    Node node;
    double current_pu;
  };
  std::vector<Source> sources;
  for (const InverterSource& s : network_->inverter_sources) {
    if (!is_live(*network_, s, s.bus) || s.doubly_fed) continue;
    if (!s.fault_current_ratio) {
      notes_.push_back("inverter source " + s.id + " left out: fault_current_ratio is missing");
      continue;
    }
    sources.push_back(
        {model.node_of_bus[at(s.bus)],
         *s.fault_current_ratio * s.rated_mva / (std::sqrt(3.0) * s.rated_kv) / model.base_ka(s.bus)});
  }
  if (sources.empty()) return;
  notes_.push_back(
      std::to_string(sources.size()) +
      (sources.size() == 1 ? " full-converter source taken as constant current"
                           : " full-converter sources taken as constant currents") +
      ", added by magnitude (6.9), also at tmin and in the steady state, their angle and negative sequence "
      "not used: obtain the maker's values. Contributions and currents of outage studies are without them");
  converter_pu_ = weighted_transfer_pu(*solver_, [&] {
    std::vector<std::pair<Node, double>> list;
    for (const Source& s : sources) list.emplace_back(s.node, s.current_pu);
    return list;
  }());
}

void Evaluation::find_branch_ratios() {
  const SequenceModel& model = solver_->model();
  const std::size_t nodes = model.node_count();
  std::vector<std::size_t> island(nodes);
  for (std::size_t n = 0; n < nodes; ++n) island[n] = n;
  const auto root = [&](std::size_t n) {
    while (island[n] != n) n = island[n] = island[island[n]];
    return n;
  };
  const auto node = [&](const Block& b, std::uint32_t p) {
    return at(model.terminals[model.block_terminals[b.first + p]].node);
  };
  const auto y = [&](const Block& b, std::uint32_t p, std::uint32_t q) {
    return model.block_y[b.first_y + p * b.count + q][kPositive];
  };
  for (const Block& b : model.blocks)
    for (std::uint32_t p = 1; p < b.count; ++p)
      if (y(b, 0, p) != Complex(0)) island[root(node(b, p))] = root(node(b, 0));
  std::map<std::pair<std::size_t, double>, double> smallest;
  std::map<std::size_t, double> largest;
  const auto level = [&](std::size_t n) {
    return std::pair(root(n), model.nominal_kv[at(model.buses_of(static_cast<Node>(n)).front())]);
  };
  const auto take = [&](std::size_t n, Complex admittance) {
    const Complex z = 1.0 / admittance;
    if (!(z.imag() > 0) || z.real() < 0) return;  // a negative arm of a star says nothing of the branch
    const double ratio = z.real() / z.imag();
    const auto [place, fresh] = smallest.emplace(level(n), ratio);
    if (!fresh) place->second = std::min(place->second, ratio);
    double& most = largest[root(n)];
    most = std::max(most, ratio);
  };
  for (const Block& b : model.blocks) {
    if (b.coupling) continue;
    for (std::uint32_t p = 0; p < b.count; ++p) {
      if (b.count == 1 && y(b, 0, 0) != Complex(0)) take(node(b, 0), y(b, 0, 0));
      for (std::uint32_t q = 0; q < b.count; ++q)
        if (q != p && y(b, p, q) != Complex(0)) take(node(b, p), -y(b, p, q));
    }
  }
  ratios_.resize(nodes);
  for (std::size_t n = 0; n < nodes; ++n) {
    const auto found = smallest.find(level(n));
    if (found != smallest.end()) ratios_[n] = {found->second, largest[root(n)]};
  }
}

// 6.10, from memory: up to 1 kV, sum I_rM <= 0.01 I"k without motors; behind transformers, sum P_rM / sum
// S_rT
// <= 0.8 / |c 100 sum S_rT / (sqrt(3) UnQ I"kQ) - 0.3|.
void Evaluation::judge_motor_rules() {
  const Network& n = *network_;
  const SequenceModel& model = solver_->model();
  for (std::size_t node = 0; node < machines_at_node_.size(); ++node) {
    double sum_ka = 0;
    for (const auto m : machines_at_node_[node])
      if (machines_[m].motor && !machines_[m].drive) sum_ka += machines_[m].rated_ka;
    const BusIndex bus = model.buses_of(static_cast<Node>(node)).front();
    if (sum_ka == 0 || model.nominal_kv[at(bus)] > 1) continue;
    const auto z = companions_->impedance_pu(kNoMotors, bus);
    if (z)
      motor_rules_.push_back(
          {{ElementKind::bus, static_cast<std::uint32_t>(at(bus))}, sum_ka, 0.01 * initial_ka(*z, bus)});
  }
  for (std::uint32_t i = 0; i < n.transformers.size(); ++i) {
    const Transformer& t = n.transformers[i];
    if (!is_live(n, t, t.hv_bus, t.lv_bus)) continue;
    double mw = 0;
    for (const auto m : machines_at_node_[at(model.node_of_bus[at(t.lv_bus)])])
      if (machines_[m].motor && !machines_[m].drive)
        mw += real_power_mw(n.induction_motors[machines_[m].element.index]);
    const auto z = companions_->impedance_pu(kNoMotors, t.hv_bus);
    if (mw == 0 || !z) continue;
    const double skq_mva = std::sqrt(3.0) * n.bus(t.hv_bus).nominal_kv * initial_ka(*z, t.hv_bus);
    const double c = solver_->prefault_pu(t.hv_bus);
    motor_rules_.push_back({{ElementKind::transformer, i},
                            mw / t.rated_mva,
                            0.8 / std::abs(c * 100 * t.rated_mva / skq_mva - 0.3)});
  }
}

double Evaluation::initial_ka(Complex z_pu, BusIndex bus) const {
  return solver_->prefault_pu(bus) / std::abs(z_pu) * solver_->model().base_ka(bus);
}

void Evaluation::peak(const FaultResult& fault, Quantities& q) const {
  const BusIndex bus = fault.fault.bus;
  const bool lv = solver_->model().nominal_kv[at(bus)] <= 1;
  const auto none = [&](const char* why) { q.not_evaluated.push_back({"ip", why}); };
  if (options_.kappa == KappaMethod::c) {
    const auto z = companions_->impedance_pu(kAtPeak, bus);
    if (!z || !(z->imag() > 0)) return none("the equivalent-frequency impedance is not inductive");
    q.r_over_x = z->real() / z->imag() * kEquivalentFrequency;
    q.kappa = kappa(*q.r_over_x);
  } else {
    const BranchRatios& ratios = ratios_[at(solver_->model().node_of_bus[at(bus)])];
    const auto z = fault.z1_ohm;
    if (!z || !(z->imag() > 0)) return none("the impedance at the fault is not inductive");
    q.r_over_x = options_.kappa == KappaMethod::a ? ratios.smallest_of_level : z->real() / z->imag();
    q.kappa = kappa(*q.r_over_x);
    if (options_.kappa == KappaMethod::b && ratios.largest_of_island >= 0.3)
      q.kappa = std::min(1.15 * *q.kappa, lv ? kLimitLv : kLimitHv);
  }
  q.ip_ka = root2() * (*q.kappa * (q.ikss_ka - q.converter_ka) + q.converter_ka);
}

std::optional<double> Evaluation::breaking_ka(const FaultResult& fault, double t_s, AtTime& at_time) const {
  const BusIndex bus = fault.fault.bus;
  const double converters = converter_ka(fault), initial = fault.current_ka + converters;
  if (fault.fault.kind != FaultKind::three_phase) return initial;
  const SequenceModel& model = solver_->model();
  const double e = solver_->prefault_pu(bus);
  const Complex ik_pu = e / (*fault.z1_ohm / model.base_ohm(bus));
  Complex ib_pu = ik_pu;
  bool known = true;
  for (const NearSources::Near& near : near_->at_node(model.node_of_bus[at(bus)])) {
    const Machine& m = machines_[near.source];
    const Complex part = m.y_pu * near.z_pu * ik_pu;
    MachinePart row{m.element, std::abs(part) * model.base_ka(m.bus), std::abs(part) / m.rated_pu, 1, {}};
    double decay = 0;  // what is left of the part at that time
    if (!m.drive) {
      row.mu = mu(row.ratio, t_s);
      decay = row.mu;
      if (m.motor && row.ratio > kFarRatio) {
        if (!m.mw_per_pole_pair) {
          known = false;
          at_time.not_evaluated.push_back(
              {"Ib", "pole_pairs or rated power of motor " + element(*network_, m.element).id});
        } else {
          row.q = iec60909::q(*m.mw_per_pole_pair, t_s);
          decay *= *row.q;
        }
      }
    }
    const Complex drop = Complex(0, (1.0 / m.y_pu).imag()) * part;
    ib_pu -= drop / e * (1 - decay) * part;
    at_time.machines.push_back(row);
  }
  if (!known) return std::nullopt;
  return std::min(std::abs(ib_pu) * model.base_ka(bus), fault.current_ka) + converters;
}

AtTime Evaluation::at_time(const FaultResult& fault, double t_s) const {
  AtTime result;
  if (!fault.has_source || fault.current_ka == 0) {
    result.ib_ka = result.idc_ka = 0;
    return result;
  }
  result.ib_ka = breaking_ka(fault, t_s, result);
  const auto ratio = dc_frequency_ratio(network_->frequency_hz, t_s);
  if (!ratio) {
    result.not_evaluated.push_back(
        {"i_dc", "the time is beyond 12.5 cycles, where the standard gives no frequency"});
    return result;
  }
  const auto z = dc_impedance_pu(*ratio, fault.fault.bus);
  if (!z || !(z->imag() > 0)) {
    result.not_evaluated.push_back({"i_dc", "the equivalent-frequency impedance is not inductive"});
    return result;
  }
  result.idc_ka = dc_current_ka(fault.current_ka + converter_ka(fault), network_->frequency_hz, t_s,
                                z->real() / z->imag() * *ratio);
  return result;
}

double Evaluation::converter_ka(const FaultResult& fault) const {
  if (converter_pu_.empty()) return 0;
  const BusIndex bus = fault.fault.bus;
  return fault.current_ka * converter_pu_[at(solver_->model().node_of_bus[at(bus)])] /
         solver_->prefault_pu(bus);
}

void Evaluation::steady(const FaultResult& fault, Quantities& q) const {
  if (fault.fault.kind != FaultKind::three_phase) {
    q.ik_ka = q.ikss_ka;
    return;
  }
  const BusIndex bus = fault.fault.bus;
  const SequenceModel& model = solver_->model();
  const auto z = companions_->impedance_pu(kNoMotors, bus);
  const double without_ka = z ? initial_ka(*z, bus) : 0;
  if (without_ka > 0) q.motor_share_percent = 100 * ((q.ikss_ka - q.converter_ka) / without_ka - 1);
  double ik_ka = without_ka;
  for (const auto index : machines_at_node_[at(model.node_of_bus[at(bus)])]) {
    const Machine& m = machines_[index];
    if (m.motor) continue;
    const SynchronousMachine& data = network_->synchronous_machines[m.element.index];
    std::optional<double> lambda = kind_ == CaseKind::max ? data.lambda_max : data.lambda_min;
    if (data.excitation == Excitation::static_terminal_fed && !lambda) lambda = 0;
    if (!lambda) continue;
    const double initial = solver_->prefault_pu(bus) * std::abs(m.y_pu) * model.base_ka(bus);
    ik_ka += *lambda * m.rated_ka - initial;
  }
  q.ik_ka = std::max(0.0, ik_ka) + q.converter_ka;
}

void Evaluation::thermal(Quantities& q) const {
  if (!q.kappa || !q.ik_ka) return;
  if (*q.ik_ka <= 0) {
    q.not_evaluated.push_back({"Ith",
                               "Ik is 0, so that n has no value: no source but motors or a machine whose "
                               "excitation collapses"});
    return;
  }
  q.m = m_factor(*q.kappa, network_->frequency_hz, options_.duration_s);
  const double ratio = q.ikss_ka / *q.ik_ka;
  q.n = ratio < kNearRatio ? 1 : n_factor(ratio, options_.duration_s);
  q.ith_ka = q.ikss_ka * std::sqrt(*q.m + *q.n);
  q.i2t_ka2s = *q.ith_ka * *q.ith_ka * options_.duration_s;
}

Quantities Evaluation::of(const FaultResult& fault) const {
  Quantities q;
  const BusIndex bus = fault.fault.bus;
  q.c = solver_->prefault_pu(bus);
  if (!fault.has_source) return q;
  q.converter_ka = converter_ka(fault);
  q.ikss_ka = fault.current_ka + q.converter_ka;
  q.skss_mva = std::sqrt(3.0) * solver_->model().nominal_kv[at(bus)] * q.ikss_ka;
  if (q.ikss_ka == 0) return q;
  peak(fault, q);
  AtTime at_tmin = at_time(fault, options_.tmin_s);
  q.ib_ka = at_tmin.ib_ka;
  q.idc_ka = at_tmin.idc_ka;
  if (q.ib_ka && q.idc_ka) q.ib_asymmetric_ka = std::hypot(*q.ib_ka, *q.idc_ka);
  q.machines = std::move(at_tmin.machines);
  std::move(at_tmin.not_evaluated.begin(), at_tmin.not_evaluated.end(), std::back_inserter(q.not_evaluated));
  steady(fault, q);
  thermal(q);
  return q;
}

}  // namespace kiloamp::iec60909
