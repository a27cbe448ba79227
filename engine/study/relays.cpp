#include "engine/study/relays.hpp"

#include <algorithm>
#include <cmath>
#include <map>
#include <queue>
#include <unordered_set>

#include "engine/network/terminals.hpp"
#include "engine/study/local_network.hpp"

namespace kiloamp {

namespace {

using detail::FaultNetwork;
using detail::LocalNetwork;
using detail::LostParts;
using detail::OutageChange;
using detail::TerminalTable;

// Below this part of the fault's current a relay has none.
constexpr double kNoCurrent = 1e-9;

bool is_source(ElementKind kind) {
  return kind == ElementKind::network_feeder || kind == ElementKind::synchronous_machine;
}
// Drives positive-sequence current.
bool is_electromotive(ElementKind kind) {
  return is_source(kind) || kind == ElementKind::induction_motor || kind == ElementKind::inverter_source;
}
// What a state of a location takes out; loads and filters never decide a setting.
bool is_taken_out(ElementKind kind) {
  return is_source(kind) || kind == ElementKind::line || kind == ElementKind::transformer ||
         kind == ElementKind::three_winding_transformer || kind == ElementKind::series_reactor ||
         kind == ElementKind::earthing_transformer;
}

// A solved network in one state, where its elements end, and how far each node is from a source.
class Base {
 public:
  Base(Network&& network, const StudyOptions& options)
      : study(std::move(network), options),
        terminals(study.model()),
        distance_(study.model().node_count(), kFar) {
    const SequenceModel& m = study.model();
    std::vector<Node> reached;
    for (std::uint32_t n = 0; n < distance_.size(); ++n) {
      const auto node = static_cast<Node>(n);
      for (auto t = m.terminal_start[n]; t < m.terminal_start[n + 1]; ++t)
        if (is_electromotive(m.terminals[t].element.kind)) distance_[n] = 0;
      if (distance_[n] == 0) reached.push_back(node);
    }
    for (std::size_t i = 0; i < reached.size(); ++i)
      for_each_neighbour(reached[i], {}, [&](Node next) {
        if (distance_[at(next)] != kFar) return;
        distance_[at(next)] = distance_[at(reached[i])] + 1;
        reached.push_back(next);
      });
  }

  /// A source still reaches `start` when two elements lead nowhere. The way is sought where sources are near.
  [[nodiscard]] bool is_fed(Node start, const std::array<std::optional<ElementRef>, 2>& without) const {
    const SequenceModel& m = study.model();
    using Place = std::pair<std::uint32_t, Node>;
    std::priority_queue<Place, std::vector<Place>, std::greater<>> open;
    std::unordered_set<std::int32_t> seen;
    const auto visit = [&](Node node) {
      if (distance_[at(node)] != kFar && seen.insert(static_cast<std::int32_t>(node)).second)
        open.emplace(distance_[at(node)], node);
    };
    visit(start);
    while (!open.empty()) {
      const Node node = open.top().second;
      open.pop();
      for (auto t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
        const ElementRef element = m.terminals[t].element;
        if (is_electromotive(element.kind) && element != without[0] && element != without[1]) return true;
      }
      for_each_neighbour(node, without, visit);
    }
    return false;
  }

  Study study;
  TerminalTable terminals;

 private:
  static constexpr std::uint32_t kFar = UINT32_MAX;

  template <typename Visit>
  void for_each_neighbour(Node node, const std::array<std::optional<ElementRef>, 2>& without,
                          Visit&& visit) const {
    const SequenceModel& m = study.model();
    for (auto t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
      const ElementRef element = m.terminals[t].element;
      if (element == without[0] || element == without[1]) continue;
      const auto& slot = study.solver().solved().slots(t)[0];
      const Block& block = m.blocks[slot.block];
      for (std::uint32_t q = 0; q < block.count; ++q)
        if (m.block_y[block.first_y + slot.position * block.count + q][kPositive] != Complex(0))
          visit(m.terminals[m.block_terminals[block.first + q]].node);
    }
  }

  std::vector<std::uint32_t> distance_;  // branches to the nearest source, positive sequence
};

// A line out of the network whose coupled group still has its rows.
struct Removed {
  ElementRef element;
  bool earthed = false;
};

// A location's surroundings in one state.
struct View {
  const Base& base;
  const LocalNetwork& z;
  RelayState state;
  const LostParts::Lost* lost_positive = nullptr;
  const LostParts::Lost* lost_zero = nullptr;
  std::optional<Removed> removed{};

  [[nodiscard]] const SequenceModel& model() const { return base.study.model(); }
  [[nodiscard]] const FaultNetwork& solved() const { return base.study.solver().solved(); }
  [[nodiscard]] bool has_source(Node n) const {
    return model().has_source[at(n)] && !is_in(lost_positive, n);
  }
  [[nodiscard]] bool has_zero_path(Node n) const {
    return model().has_zero_path[at(n)] && !is_in(lost_zero, n);
  }
  static bool is_in(const LostParts::Lost* lost, Node n) {
    return lost != nullptr && std::find(lost->nodes.begin(), lost->nodes.end(), n) != lost->nodes.end();
  }
};

// Voltage drop at a terminal for 1 pu of fault current, per sequence.
using Drop = std::function<BySequence<Complex>(std::uint32_t terminal)>;

// A terminal's row of admittances over the terminals of its blocks. A line removed from its coupled group:
// y' = y - y_x y_x^T / y_xx, or y without the line's rows when it is earthed.
std::vector<LocalNetwork::Entry> row_of(const View& view, std::uint32_t terminal) {
  const SequenceModel& m = view.model();
  std::vector<LocalNetwork::Entry> row;
  for (const FaultNetwork::Slot& slot : view.solved().slots(terminal)) {
    if (!slot.used) continue;
    const Block& block = m.blocks[slot.block];
    const auto y = [&](std::uint32_t p, std::uint32_t q) -> const BySequence<Complex>& {
      return m.block_y[block.first_y + p * block.count + q];
    };
    std::optional<std::uint32_t> x;  // an end of the removed line in this group
    for (std::uint32_t q = 0; block.coupling && view.removed && q < block.count && !x; ++q)
      if (m.terminals[m.block_terminals[block.first + q]].element == view.removed->element) x = q;
    for (std::uint32_t q = 0; q < block.count; ++q) {
      const std::uint32_t other = m.block_terminals[block.first + q];
      if (x && m.terminals[other].element == view.removed->element) continue;
      BySequence<Complex> entry = y(slot.position, q);
      if (x && !view.removed->earthed)
        entry[kZero] -= y(slot.position, *x)[kZero] * y(*x, q)[kZero] / y(*x, *x)[kZero];
      row.push_back({other, entry});
    }
  }
  return row;
}

// Current from the element into the bus at a terminal for 1 pu of fault current.
BySequence<Complex> share(const std::vector<LocalNetwork::Entry>& row, const Drop& drop) {
  BySequence<Complex> sum{};
  for (const LocalNetwork::Entry& entry : row) {
    const auto v = drop(entry.terminal);
    for (int s = 0; s < 3; ++s) sum[s] += entry.y[s] * v[s];
  }
  return sum;
}

BySequence<Complex> times(const BySequence<Complex>& a, const BySequence<Complex>& b, double scale) {
  return {a[0] * b[0] * scale, a[1] * b[1] * scale, a[2] * b[2] * scale};
}

struct FaultAt {
  RelayFaultPlace place;
  BusIndex bus;
  BySequence<Complex> z_kk{};
  bool has_zero = false;
  double prefault_pu = 1;
};

class Rows {
 public:
  Rows(const RelayLocation& location, std::size_t index, const StudyOptions& options,
       std::vector<RelayRow>& rows)
      : location_(location), index_(index), options_(options), rows_(rows) {}

  void of(const View& view, const std::vector<BusIndex>& further) {
    const auto own = view.base.terminals.of(location_.branch);
    const SequenceModel& m = view.model();
    const auto at_bus =
        std::find_if(own.begin(), own.end(), [&](auto t) { return m.terminals[t].bus == location_.bus; });
    if (at_bus == own.end()) return;  // the branch is out in this state
    terminal_ = *at_bus;
    k0_ = residual_compensation_of(view.base.study, location_.branch);
    angle_ = branch_angle(view);
    bus_fault(view, RelayFaultPlace::close_in, location_.bus);
    for (const auto t : own)
      if (t != terminal_) bus_fault(view, RelayFaultPlace::remote_bus, m.terminals[t].bus);
    if (location_.branch.kind == ElementKind::line)
      for (const auto t : own)
        if (t != terminal_) line_end(view, t);
    for (const BusIndex bus : further)
      if (m.node_of_bus[at(bus)] != Node::none && view.z.has(m.node_of_bus[at(bus)]))
        bus_fault(view, RelayFaultPlace::further_bus, bus);
  }

 private:
  double branch_angle(const View& view) const {
    const auto& slot = view.solved().slots(terminal_)[0];
    const Block& block = view.model().blocks[slot.block];
    return std::arg(
        1.0 / view.model().block_y[block.first_y + slot.position * block.count + slot.position][kPositive]);
  }

  void bus_fault(const View& view, RelayFaultPlace place, BusIndex bus) {
    const SequenceModel& m = view.model();
    const Node k = m.node_of_bus[at(bus)];
    if (!view.has_source(k)) return;
    const FaultAt fault{place, bus, view.z.z_all(k, k), view.has_zero_path(k),
                        view.base.study.solver().prefault_pu(bus)};
    solve(view, fault, [&](std::uint32_t t) { return view.z.z_all(m.terminals[t].node, k); });
  }

  void line_end(const View& view, std::uint32_t far) {
    const LocalNetwork::OpenEnd end = view.z.open(view.model(), far, row_of(view, far));
    if (!view.z.has_path(end, kPositive) ||
        !view.base.is_fed(view.model().terminals[terminal_].node, {location_.branch, view.state.element}))
      return;
    const FaultAt fault{
        RelayFaultPlace::line_end, view.model().terminals[far].bus, view.z.z_of_end(end),
        view.z.has_path(end, kZero) && view.has_zero_path(view.model().terminals[terminal_].node),
        view.base.study.solver().prefault_pu(location_.bus)};
    solve(view, fault, [&](std::uint32_t t) {
      return t == far ? view.z.z_of_end(end) : view.z.z_to_end(view.model().terminals[t].node, end);
    });
  }

  void solve(const View& view, const FaultAt& fault, const Drop& drop) {
    const SequenceModel& m = view.model();
    const double ohm = m.base_ohm(fault.bus);
    const Complex zf = options_.phase_ohm / ohm, ze = options_.earth_ohm / ohm;
    TheveninData z{fault.z_kk[kPositive], fault.z_kk[kNegative], std::nullopt};
    if (fault.has_zero) z.z0 = fault.z_kk[kZero];
    const auto into_bus = share(row_of(view, terminal_), drop);
    const auto at_relay = drop(terminal_);
    const int lag = m.lag_clock[at(location_.bus)] - m.lag_clock[at(fault.bus)];
    const double kv = m.nominal_kv[at(location_.bus)] / std::sqrt(3.0);
    for (const FaultKind kind : options_.kinds) {
      const auto i_pu = connect_sequences(kind, z, fault.prefault_pu, zf, ze).current;
      RelayRow row;
      row.location = index_;
      row.place = fault.place;
      row.place_bus = fault.bus;
      row.kind = kind;
      row.state = view.state;
      row.fault_ka = times(i_pu, {1, 1, 1}, m.base_ka(fault.bus));
      auto current = times(into_bus, i_pu, -m.base_ka(location_.bus));
      if (fault.place == RelayFaultPlace::close_in)
        for (int s = 0; s < 3; ++s) current[s] += row.fault_ka[s];
      row.primary.current_ka = turned(current, lag);
      row.prefault_kv = view.base.study.solver().prefault_kv(location_.bus, fault.bus);
      row.primary.voltage_kv = turned(times(at_relay, i_pu, -kv), lag);
      row.primary.voltage_kv[kPositive] += row.prefault_kv;
      row.primary.voltage_kv[kZero] += neutral_shift(view, fault, z, i_pu, zf, kind) * kv;
      measure(row);
      rows_.push_back(row);
    }
  }

  // Without a path to earth no zero-sequence current flows, yet the fault decides the potential of its
  // island.
  Complex neutral_shift(const View& view, const FaultAt& fault, const TheveninData& z,
                        const BySequence<Complex>& i_pu, Complex zf, FaultKind kind) const {
    const bool earth = kind == FaultKind::line_to_ground || kind == FaultKind::double_line_to_ground;
    const SequenceModel& m = view.model();
    const Node here = m.node_of_bus[at(location_.bus)], there = m.node_of_bus[at(fault.bus)];
    if (!earth || z.z0 || m.zero_island[at(here)] != m.zero_island[at(there)]) return 0;
    return earth_fault_shift_pu(kind, z, fault.prefault_pu, i_pu, zf) *
           (m.zero_ratio[at(here)] / m.zero_ratio[at(there)]);
  }

  void measure(RelayRow& row) const {
    const double relay_ka = largest_phase(row.primary.current_ka), fault_ka = largest_phase(row.fault_ka);
    if (!(relay_ka > kNoCurrent * fault_ka)) {
      row.primary.current_ka = {};
      return;
    }
    row.loops = apparent_impedances(row.primary, k0_);
    row.direction = direction(row.primary, row.prefault_kv, angle_);
    row.infeed_factor = fault_ka / relay_ka;
    if (std::abs(row.fault_ka[kZero]) > 0)
      row.earth_share = std::abs(row.primary.current_ka[kZero]) / std::abs(row.fault_ka[kZero]);
  }

  const RelayLocation& location_;
  std::size_t index_;
  const StudyOptions& options_;
  std::vector<RelayRow>& rows_;
  std::uint32_t terminal_ = 0;
  Complex k0_ = 0;
  double angle_ = 0;
};

// The nodes that a location's faults and outages touch.
class Surroundings {
 public:
  Surroundings(const Base& base, const RelayLocation& location, int steps)
      : base_(base), location_(location) {
    const SequenceModel& m = base.study.model();
    add_bus(location.bus);
    for (const auto t : base.terminals.of(location.branch)) {
      add_terminal(t);
      if (m.terminals[t].bus != location.bus) remote_.push_back(m.terminals[t].bus);
    }
    for (const BusIndex bus : remote_) add_bus(bus);
    find_further(steps);
  }
  void add(Node node) {
    if (std::find(nodes.begin(), nodes.end(), node) == nodes.end()) nodes.push_back(node);
  }

  std::vector<Node> nodes;
  std::vector<BusIndex> further;
  std::vector<ElementRef> elements;  ///< at the relay's bus or a remote one, its own branch not

 private:
  void add_terminal(std::uint32_t t) {
    const SequenceModel& m = base_.study.model();
    for (const auto& slot : base_.study.solver().solved().slots(t)) {
      if (!slot.used) continue;
      const Block& block = m.blocks[slot.block];
      for (std::uint32_t q = 0; q < block.count; ++q)
        add(m.terminals[m.block_terminals[block.first + q]].node);
    }
  }
  void add_bus(BusIndex bus) {
    const SequenceModel& m = base_.study.model();
    const Node node = m.node_of_bus[at(bus)];
    if (node == Node::none) return;
    add(node);
    for (auto t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
      if (m.terminals[t].bus != bus) continue;
      const ElementRef element = m.terminals[t].element;
      if (!is_taken_out(element.kind)) continue;
      add_terminal(t);
      if (element != location_.branch &&
          std::find(elements.begin(), elements.end(), element) == elements.end())
        elements.push_back(element);
    }
    for (const MergedSwitch& s : m.closed_switches)
      if ((s.from == bus || s.to == bus) &&
          std::find(elements.begin(), elements.end(), s.element) == elements.end())
        elements.push_back(s.element);
  }
  void find_further(int steps) {
    const SequenceModel& m = base_.study.model();
    std::vector<BusIndex> reached = remote_, seen = remote_;
    seen.push_back(location_.bus);
    for (int step = 0; step < steps; ++step) {
      std::vector<BusIndex> next;
      for (const BusIndex bus : reached) {
        const Node node = m.node_of_bus[at(bus)];
        for (auto t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
          if (m.terminals[t].bus != bus || m.terminals[t].element == location_.branch) continue;
          for (const BusIndex other : buses_of(base_.study.network(), m.terminals[t].element)) {
            if (std::find(seen.begin(), seen.end(), other) != seen.end() ||
                m.node_of_bus[at(other)] == Node::none)
              continue;
            seen.push_back(other);
            next.push_back(other);
            further.push_back(other);
            add(m.node_of_bus[at(other)]);
          }
        }
      }
      reached = std::move(next);
    }
  }

  const Base& base_;
  const RelayLocation& location_;
  std::vector<BusIndex> remote_;
};

}  // namespace

struct RelayStudy::Body {
  Network given;
  RelayOptions options;
  RelayLocations locations;
  std::unique_ptr<Base> intact;
  std::vector<std::pair<RelayState, std::unique_ptr<Base>>> others;

  struct Source {
    ElementRef element;
    Complex y;
  };
  std::vector<Source> sources;
  std::vector<sparse::Index> source_rows;

  void list_sources();
  [[nodiscard]] std::optional<ElementRef> strongest_source(BusIndex bus, LocalNetwork::Solver& solver) const;
  [[nodiscard]] static std::vector<ElementRef> coupled_lines(const Network& network, ElementRef branch);
};

class RelayStudy::Workspace {
 public:
  explicit Workspace(const Body& body)
      : solver(body.intact->study.solver().solved().factors().sparse_solver()),
        finder_(body.intact->study.model(), body.intact->study.solver().solved()) {
    for (const auto& [state, base] : body.others)
      other_solvers.push_back(base->study.solver().solved().factors().sparse_solver());
  }
  /// What an element's outage cuts off does not depend on the location.
  const LostParts::Lost& lost(const OutageChange& change, int sequence) {
    auto& known = lost_[static_cast<std::size_t>(sequence)];
    const auto found = known.find(change.element);
    if (found != known.end()) return found->second;
    return known.emplace(change.element, finder_.find(change, sequence)).first->second;
  }

  LocalNetwork::Solver solver;
  std::vector<LocalNetwork::Solver> other_solvers;

 private:
  LostParts finder_;
  std::array<std::map<ElementRef, LostParts::Lost>, 2> lost_;  // zero, positive sequence
};

RelayStudy::RelayStudy(const Network& network, const RelayOptions& options)
    : body_(std::make_unique<Body>()) {
  body_->given = network;
  body_->options = options;
  StudyOptions study = options.study;
  study.buses.clear();
  study.case_kind = CaseKind::max;
  body_->intact = std::make_unique<Base>(Network(network), study);
  body_->list_sources();
  body_->locations = relay_locations(body_->intact->study.network(), options.everywhere);
  StudyOptions weak = study;
  weak.case_kind = CaseKind::min;
  body_->others.emplace_back(RelayState{RelayStateKind::min_sources, {}, {}},
                             std::make_unique<Base>(Network(network), weak));
  for (std::size_t s = 0; s < network.scenarios.size() && !study.scenario; ++s) {
    if (!network.scenarios[s].is_in_service()) continue;
    StudyOptions other = study;
    other.scenario = s;
    body_->others.emplace_back(RelayState{RelayStateKind::scenario, {}, s},
                               std::make_unique<Base>(Network(network), other));
  }
}
RelayStudy::~RelayStudy() = default;

const Study& RelayStudy::intact() const { return body_->intact->study; }
const RelayLocations& RelayStudy::locations() const { return body_->locations; }
std::shared_ptr<RelayStudy::Workspace> RelayStudy::make_workspace() const {
  return std::make_shared<Workspace>(*body_);
}

void RelayStudy::Body::list_sources() {
  const SequenceModel& m = intact->study.model();
  for (const Block& b : m.blocks) {
    const Terminal& t = m.terminals[m.block_terminals[b.first]];
    if (!is_source(t.element.kind)) continue;
    sources.push_back({t.element, m.block_y[b.first_y][kPositive]});
    source_rows.push_back(static_cast<sparse::Index>(t.node));
  }
}

std::optional<ElementRef> RelayStudy::Body::strongest_source(BusIndex bus,
                                                             LocalNetwork::Solver& solver) const {
  solver.clear();
  solver.put(0, static_cast<sparse::Index>(intact->study.model().node_of_bus[at(bus)]), {0, 1, 0});
  solver.solve_at(source_rows);
  double most = 0;
  std::optional<ElementRef> strongest;
  for (std::size_t s = 0; s < sources.size(); ++s)
    if (const double part = std::abs(sources[s].y * solver.get(0, source_rows[s])[kPositive]); part > most) {
      most = part;
      strongest = sources[s].element;
    }
  return strongest;
}

std::vector<ElementRef> RelayStudy::Body::coupled_lines(const Network& network, ElementRef branch) {
  std::vector<ElementRef> coupled;
  for (const MutualCoupling& c : network.mutual_couplings) {
    if (!c.is_in_service() || branch.kind != ElementKind::line) continue;
    if (c.line_a == branch.index || c.line_b == branch.index)
      coupled.push_back({ElementKind::line, c.line_a == branch.index ? c.line_b : c.line_a});
  }
  return coupled;
}

void RelayStudy::at_location(std::size_t index, Workspace& workspace, std::vector<RelayRow>& rows) const {
  const RelayLocation& location = body_->locations.list[index];
  const Base& base = *body_->intact;
  const Network& network = base.study.network();
  const SequenceModel& m = base.study.model();
  const FaultNetwork& solved = base.study.solver().solved();
  rows.clear();
  Rows make(location, index, base.study.options(), rows);
  Surroundings around(base, location, body_->options.further);
  std::vector<RelayState> states;
  for (const ElementRef element : around.elements) states.push_back({RelayStateKind::out, element, {}});
  if (const auto strongest = body_->strongest_source(location.bus, workspace.solver)) {
    for (const auto t : base.terminals.of(*strongest)) around.add(m.terminals[t].node);
    if (*strongest != location.branch)
      states.push_back({RelayStateKind::strongest_source_out, strongest, {}});
  }
  for (const ElementRef line : Body::coupled_lines(network, location.branch))
    if (!base.terminals.of(line).empty()) states.push_back({RelayStateKind::parallel_line_earthed, line, {}});

  const LocalNetwork whole(around.nodes, workspace.solver);
  make.of({base, whole, {}}, around.further);
  for (const RelayState& state : states) {
    const bool earthed = state.kind == RelayStateKind::parallel_line_earthed;
    const auto change = state.element->kind == ElementKind::bus_switch
                            ? std::nullopt
                            : detail::outage_change(network, m, solved, *state.element,
                                                    base.terminals.of(*state.element), earthed);
    LocalNetwork changed = whole;
    const auto suspect = change ? changed.apply(*change) : std::nullopt;
    if (suspect) {
      View view{base, changed, state};
      view.lost_positive = &workspace.lost(*change, kPositive);
      if ((*suspect)[kZero]) view.lost_zero = &workspace.lost(*change, kZero);
      if (state.element->kind == ElementKind::line) view.removed = Removed{*state.element, earthed};
      make.of(view, around.further);
      continue;
    }
    // A coupler, or a part cut off in more ways than one: that state's own network.
    Network alone = body_->given;
    if (base.study.options().scenario) apply_scenario(alone, *base.study.options().scenario);
    if (state.element->kind == ElementKind::bus_switch)
      alone.switches[state.element->index].closed = false;
    else
      element(alone, *state.element).in_service = false;
    StudyOptions options = base.study.options();
    options.scenario.reset();
    options.threads = 1;
    const Base other(std::move(alone), options);
    auto solver = other.study.solver().solved().factors().sparse_solver();
    const Surroundings there(other, location, body_->options.further);
    const LocalNetwork local(there.nodes, solver);
    make.of({other, local, state}, there.further);
  }
  for (std::size_t k = 0; k < body_->others.size(); ++k) {
    const auto& [state, other] = body_->others[k];
    if (other->study.model().node_of_bus[at(location.bus)] == Node::none) continue;
    const Surroundings there(*other, location, body_->options.further);
    const LocalNetwork local(there.nodes, workspace.other_solvers[k]);
    make.of({*other, local, state}, there.further);
  }
}

Complex residual_compensation_of(const Study& study, ElementRef branch) {
  if (branch.kind != ElementKind::line) return 0;
  const auto z = line_impedance_ohm(study.network().lines[branch.index]);
  return residual_compensation(z[kPositive], z[kZero]);
}

RelayLocations relay_locations(const Network& n, bool everywhere) {
  RelayLocations locations;
  const auto is_live_branch = [&](ElementRef branch) {
    const auto buses = buses_of(n, branch);
    return element(n, branch).is_in_service() &&
           std::all_of(buses.begin(), buses.end(), [&](BusIndex b) { return n.bus(b).is_in_service(); });
  };
  if (everywhere) {
    for_each_section(n, [&](ElementKind kind, const auto& section) {
      if (kind != ElementKind::line && kind != ElementKind::transformer &&
          kind != ElementKind::three_winding_transformer && kind != ElementKind::series_reactor)
        return;
      for (std::uint32_t i = 0; i < section.size(); ++i) {
        const ElementRef branch{kind, i};
        if (!is_live_branch(branch)) continue;
        for (const BusIndex bus : buses_of(n, branch))
          locations.list.push_back({std::nullopt, bus, branch, {}, {}});
      }
    });
    return locations;
  }
  const auto ratio = [](const std::optional<std::vector<double>>& pair) {
    return pair ? std::optional((*pair)[0] / (*pair)[1]) : std::nullopt;
  };
  for (std::uint32_t i = 0; i < n.relays.size(); ++i) {
    const Relay& relay = n.relays[i];
    if (!relay.is_in_service()) continue;
    const char* why = !relay.branch ? "has no branch to look into"
                      : relay.branch->kind == ElementKind::bus_switch
                          ? "stands on a switch, which has no impedance: give "
                            "the branch behind it"
                      : !is_live_branch(*relay.branch) ? "looks into a branch that is out of service"
                                                       : nullptr;
    if (why != nullptr)
      locations.left_out.push_back("relay " + relay.id + " " + why);
    else
      locations.list.push_back({ElementRef{ElementKind::relay, i}, relay.bus, *relay.branch,
                                ratio(relay.ct_ratio), ratio(relay.vt_ratio)});
  }
  return locations;
}

const char* place_name(RelayFaultPlace place) {
  static constexpr const char* kNames[] = {"close-in", "remote bus", "line end open", "further bus"};
  return kNames[static_cast<std::size_t>(place)];
}

std::string state_name(const Network& network, const RelayState& state) {
  switch (state.kind) {
    case RelayStateKind::intact:
      return "intact";
    case RelayStateKind::out:
      return element(network, *state.element).id +
             (state.element->kind == ElementKind::bus_switch ? " open" : " out");
    case RelayStateKind::strongest_source_out:
      return "strongest source " + element(network, *state.element).id + " out";
    case RelayStateKind::parallel_line_earthed:
      return element(network, *state.element).id + " out and earthed";
    case RelayStateKind::min_sources:
      return "sources at minimum";
    case RelayStateKind::scenario:
      return network.scenarios[*state.scenario].id;
  }
  return "";
}

}  // namespace kiloamp
