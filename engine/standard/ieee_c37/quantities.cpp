#include "engine/standard/ieee_c37/quantities.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "engine/fault/fault_network.hpp"
#include "engine/standard/ieee_c37/formulas.hpp"

namespace kiloamp::ieee_c37 {

namespace {

// A generator whose current is above this part of that for a fault at its terminals is near enough to decay.
constexpr double kLocalShare = 0.4;
constexpr double kXOverRTolerance = 0.1;
constexpr double kNothingLocal = 1e-6;  // share that is rounding

// Parts of the network that no transformer separates, and which of them one transformer joins.
class Levels {
 public:
  explicit Levels(const SequenceModel& model) : level_(model.node_count()) {
    std::iota(level_.begin(), level_.end(), 0U);
    const auto node = [&](const Block& b, std::uint32_t p) {
      return static_cast<std::uint32_t>(at(model.terminals[model.block_terminals[b.first + p]].node));
    };
    const auto is_transformer = [&](const Block& b) {
      const ElementKind kind = model.terminals[model.block_terminals[b.first]].element.kind;
      return kind == ElementKind::transformer || kind == ElementKind::three_winding_transformer;
    };
    for (const Block& b : model.blocks)  // coupled lines may be of two voltages
      for (std::uint32_t p = 1; p < b.count && !b.coupling && !is_transformer(b); ++p)
        level_[root(node(b, p))] = root(node(b, 0));
    for (std::uint32_t n = 0; n < level_.size(); ++n) level_[n] = root(n);
    for (const Block& b : model.blocks)
      for (std::uint32_t p = 0; p < b.count && is_transformer(b); ++p)
        for (std::uint32_t q = 0; q < b.count; ++q)
          if (p != q) joined_.emplace_back(level_[node(b, p)], level_[node(b, q)]);
    std::sort(joined_.begin(), joined_.end());
  }
  [[nodiscard]] bool within_one_transformer(Node a, Node b) const {
    const auto x = level_[at(a)], y = level_[at(b)];
    return x == y || std::binary_search(joined_.begin(), joined_.end(), std::pair(x, y));
  }

 private:
  std::uint32_t root(std::uint32_t n) {
    while (level_[n] != n) n = level_[n] = level_[level_[n]];
    return n;
  }
  std::vector<std::uint32_t> level_;
  std::vector<std::pair<std::uint32_t, std::uint32_t>> joined_;
};

}  // namespace

Evaluation::Evaluation(const Network& given, const FaultSolver& first_cycle,
                       const std::vector<Prefault>& prefault, const SequenceOptions& sequence,
                       const Options& options, int threads)
    : first_cycle_(&first_cycle), first_cycle_separate_(first_cycle, threads) {
  std::vector<Finding> missing;
  for (const DutyNetwork which : {DutyNetwork::first_cycle, DutyNetwork::interrupting})
    reactances_[static_cast<std::size_t>(which)] =
        machine_reactances(given, which, options.small_motors, missing);
  missing.clear();  // what the study itself lacked, it refused
  reactances_[static_cast<std::size_t>(DutyNetwork::delayed)] =
      machine_reactances(given, DutyNetwork::delayed, options.small_motors, missing);
  SequenceOptions with_parts = sequence;
  with_parts.separate_parts = true;
  interrupting_ = solve(given, DutyNetwork::interrupting, prefault, with_parts, threads);
  if (missing.empty())
    delayed_ = solve(given, DutyNetwork::delayed, prefault, sequence, threads);
  else
    notes_.push_back("currents after about 30 cycles not evaluated: xd_transient_percent of " +
                     element(given, *missing.front().element).id +
                     (missing.size() > 1 ? " and " + std::to_string(missing.size() - 1) + " more" : "") +
                     " is missing");
  find_nacd(given, threads);
}

Evaluation::Solved Evaluation::solve(const Network& given, DutyNetwork which,
                                     const std::vector<Prefault>& prefault, const SequenceOptions& sequence,
                                     int threads) const {
  Network network = given;
  apply(reactances_[static_cast<std::size_t>(which)], network);
  Solved solved;
  solved.model = std::make_unique<const SequenceModel>(build_sequence_model(network, sequence));
  solved.solver_ = std::make_unique<const FaultSolver>(*solved.model, prefault, threads, first_cycle_);
  if (sequence.separate_parts)
    solved.separate = std::make_unique<const SeparateNetworks>(*solved.solver_, threads);
  return solved;
}

void Evaluation::find_nacd(const Network& given, int threads) {
  const FaultSolver& solver = interrupting_.solver();
  const SequenceModel& model = solver.model();
  std::vector<std::array<Complex, 3>> share(model.node_count());
  std::vector<SourcePlace> places;
  std::vector<Complex> y_of_place;
  for (const Block& b : model.blocks) {
    const Terminal& t = model.terminals[model.block_terminals[b.first]];
    const bool machine = t.element.kind == ElementKind::synchronous_machine;
    const bool motor = t.element.kind == ElementKind::induction_motor ||
                       (machine && given.synchronous_machines[t.element.index].role == MachineRole::motor);
    const bool source = machine || t.element.kind == ElementKind::network_feeder ||
                        t.element.kind == ElementKind::inverter_source;
    if (motor || !source) continue;
    const Complex y = model.block_y[b.first_y][kPositive];
    share[at(t.node)][kPositive] += y;
    if (!machine) continue;
    places.push_back({t.node, kLocalShare});
    y_of_place.push_back(y);
  }
  solver.solved().factors().solve(share);
  std::vector<double> e_pu(model.node_count(), 1.0);
  for (std::size_t n = 0; n < e_pu.size(); ++n)
    e_pu[n] = solver.prefault_pu(model.buses_of(static_cast<Node>(n)).front());
  const Levels levels(model);
  const NearSources near(solver, places, e_pu, threads);
  nacd_.assign(model.node_of_bus.size(), 1.0);
  for (std::size_t bus = 0; bus < nacd_.size(); ++bus) {
    const Node node = model.node_of_bus[bus];
    if (node == Node::none || !model.has_source[at(node)]) continue;
    Complex remote = share[at(node)][kPositive];
    for (const NearSources::Near& source : near.at_node(node))
      if (levels.within_one_transformer(places[source.source].node, node))
        remote -= y_of_place[source.source] * source.z_pu;
    nacd_[bus] = std::abs(remote) > 1 - kNothingLocal ? 1.0 : std::abs(remote);
  }
}

NetworkCurrent Evaluation::current(const Fault& fault, const FaultSolver& solver,
                                   const SeparateNetworks& separate) const {
  NetworkCurrent current;
  const auto z = solver.thevenin_pu(fault.bus);
  if (!z) return current;
  const SequenceModel& model = solver.model();
  const double e = solver.prefault_pu(fault.bus), base_ka = model.base_ka(fault.bus),
               base_ohm = model.base_ohm(fault.bus);
  const SequenceFault whole =
      connect_sequences(fault.kind, *z, e, fault.phase_ohm / base_ohm, fault.earth_ohm / base_ohm);
  current.ez_ka = largest_phase(whole.current) * base_ka;
  if (whole.loop.real() > 0 && whole.loop.imag() > 0)
    current.complex_x_over_r = whole.loop.imag() / whole.loop.real();
  if (const auto parts = separate.at_bus(fault.bus)) {
    TheveninData x{Complex(0, parts->x1), Complex(0, parts->x1), std::nullopt};
    if (parts->x0) x.z0 = Complex(0, *parts->x0);
    current.ex_ka = largest_phase(connect_sequences(fault.kind, x, e, 0, 0).current) * base_ka;
    current.x_over_r = parts->x_over_r(fault.kind);
  }
  return current;
}

Quantities Evaluation::of(const FaultResult& fault) const {
  Quantities q;
  if (!fault.has_source) return q;
  q.first_cycle = current(fault.fault, *first_cycle_, first_cycle_separate_);
  q.interrupting = current(fault.fault, interrupting_.solver(), *interrupting_.separate);
  if (q.first_cycle.x_over_r) {
    q.asymmetric_ka = q.first_cycle.ez_ka * half_cycle_asymmetry(*q.first_cycle.x_over_r);
    q.crest_ka = q.first_cycle.ez_ka * crest_factor(*q.first_cycle.x_over_r);
  }
  q.nacd = nacd_[at(fault.fault.bus)];
  if (delayed_) {
    const auto z = delayed_->solver().thevenin_pu(fault.fault.bus);
    const SequenceModel& model = delayed_->solver().model();
    const double ohm = model.base_ohm(fault.fault.bus);
    q.delayed_ka =
        z ? largest_phase(connect_sequences(fault.fault.kind, *z,
                                            delayed_->solver().prefault_pu(fault.fault.bus),
                                            fault.fault.phase_ohm / ohm, fault.fault.earth_ohm / ohm)
                              .current) *
                model.base_ka(fault.fault.bus)
          : 0.0;
  }
  return q;
}

bool x_over_r_differ(const NetworkCurrent& c) {
  return c.x_over_r && c.complex_x_over_r &&
         std::abs(*c.x_over_r - *c.complex_x_over_r) > kXOverRTolerance * *c.complex_x_over_r;
}

}  // namespace kiloamp::ieee_c37
