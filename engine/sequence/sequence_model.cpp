#include "engine/sequence/sequence_model.hpp"

#include <Eigen/LU>
#include <algorithm>
#include <cmath>
#include <numeric>

#include "engine/sequence/islands.hpp"

namespace kiloamp {

double SequenceModel::base_ka(BusIndex bus) const {
  return base_mva / (std::sqrt(3.0) * nominal_kv[at(bus)]);
}

namespace {

using detail::Islands;
using detail::Link;

// An end of a line in a coupled group.
struct CoupledEnd {
  Eigen::Index line;
  BusIndex bus;
  double sign;
};

class Builder {
 public:
  Builder(const Network& network, const SequenceOptions& options) : network_(network), options_(options) {}

  SequenceModel build() {
    make_nodes();
    positive_.emplace(model_.node_count());
    zero_.emplace(model_.node_count());
    add_sources();
    add_lines();
    add_transformers();
    add_rest();
    if (!findings_.empty()) throw NetworkError(std::move(findings_));
    finish_islands();
    sort_terminals();
    return std::move(model_);
  }

 private:
  void make_nodes();
  void add_sources();
  void add_lines();
  void add_coupled_group(const std::vector<std::uint32_t>& members,
                         const std::vector<std::uint32_t>& couplings);
  void add_transformers();
  void add_rest();
  void finish_islands();
  void sort_terminals();

  /// make(Part) gives the element's circuit.
  template <typename Make>
  void add_block(ElementRef element, const Make& make);
  void add_circuit(ElementRef element, const Circuit& circuit);
  void add_coupled_y(const Eigen::MatrixXcd& y, const std::vector<CoupledEnd>& ends, Part part);
  void join(const Circuit& circuit);

  const Network& network_;
  SequenceOptions options_;
  SequenceModel model_;
  std::optional<Islands> positive_, zero_;
  std::vector<Link> links_;
  std::vector<Finding> findings_;
};

void Builder::make_nodes() {
  const std::size_t buses = network_.buses.size();
  model_.base_mva = network_.base();
  model_.nominal_kv.resize(buses);
  for (std::size_t b = 0; b < buses; ++b) model_.nominal_kv[b] = network_.buses[b].nominal_kv;

  Islands merged(buses);
  for (std::uint32_t i = 0; i < network_.switches.size(); ++i) {
    const BusSwitch& s = network_.switches[i];
    if (!s.closed || !is_live(network_, s, s.from, s.to)) continue;
    merged.join(static_cast<Node>(at(s.from)), static_cast<Node>(at(s.to)));
    model_.closed_switches.push_back({{ElementKind::bus_switch, i}, s.from, s.to});
  }
  std::vector<Node> node_of_root(buses, Node::none);
  model_.node_of_bus.assign(buses, Node::none);
  std::int32_t count = 0;
  for (std::size_t b = 0; b < buses; ++b) {
    if (!network_.buses[b].is_in_service()) continue;
    Node& node = node_of_root[at(merged.representative(static_cast<Node>(b)))];
    if (node == Node::none) node = static_cast<Node>(count++);
    model_.node_of_bus[b] = node;
  }
  model_.bus_start.assign(static_cast<std::size_t>(count) + 1, 0);
  for (const Node n : model_.node_of_bus)
    if (n != Node::none) ++model_.bus_start[at(n)];
  std::exclusive_scan(model_.bus_start.begin(), model_.bus_start.end(), model_.bus_start.begin(), 0U);
  model_.node_buses.resize(model_.bus_start.back());
  std::vector<std::uint32_t> fill(model_.bus_start.begin(), model_.bus_start.end() - 1);
  for (std::size_t b = 0; b < buses; ++b)
    if (model_.node_of_bus[b] != Node::none)
      model_.node_buses[fill[at(model_.node_of_bus[b])]++] = static_cast<BusIndex>(b);
}

// Joins what the circuit joins; voltages without current follow open_kv against the nominal voltages.
void Builder::join(const Circuit& c) {
  const auto node = [&](int i) { return model_.node_of_bus[at(c.bus[i])]; };
  for (int i = 0; i < c.terminals; ++i) {
    for (int j = i + 1; j < c.terminals; ++j) {
      if (c.group[kPositive][i] >= 0 && c.group[kPositive][i] == c.group[kPositive][j])
        positive_->join(node(i), node(j));
      if (c.group[kZero][i] < 0 || c.group[kZero][i] != c.group[kZero][j]) continue;
      const double ratio =
          c.open_kv[j] / c.open_kv[i] * model_.nominal_kv[at(c.bus[i])] / model_.nominal_kv[at(c.bus[j])];
      zero_->join(node(i), node(j), ratio);
    }
    if (c.group[kZero][i] >= 0 && c.earthed[kZero]) zero_->mark(node(i));
  }
}

template <typename Make>
void Builder::add_block(ElementRef element, const Make& make) {
  add_circuit(element, make(Part::whole));
  if (!options_.separate_parts) return;
  const Circuit x = make(Part::reactance), r = make(Part::resistance);
  for (int i = 0; i < x.terminals; ++i)
    for (int j = 0; j < x.terminals; ++j) {
      const double scale =
          model_.nominal_kv[at(x.bus[i])] * model_.nominal_kv[at(x.bus[j])] / model_.base_mva;
      model_.block_parts.push_back(
          {-x.y_siemens[kPositive][i][j].imag() * scale, -x.y_siemens[kZero][i][j].imag() * scale,
           r.y_siemens[kPositive][i][j].real() * scale, r.y_siemens[kZero][i][j].real() * scale});
    }
}

void Builder::add_circuit(ElementRef element, const Circuit& c) {
  Block block{static_cast<std::uint32_t>(model_.block_terminals.size()),
              static_cast<std::uint32_t>(c.terminals), static_cast<std::uint32_t>(model_.block_y.size())};
  for (int i = 0; i < c.terminals; ++i) {
    const bool shared = c.neutral_shared && i < 2;
    const NeutralPath neutral = !c.neutral_earthed[i] ? NeutralPath::none
                                : shared              ? NeutralPath::shared
                                                      : NeutralPath::own;
    model_.block_terminals.push_back(static_cast<std::uint32_t>(model_.terminals.size()));
    model_.terminals.push_back({element, c.bus[i], model_.node_of_bus[at(c.bus[i])], neutral});
  }
  for (int i = 0; i < c.terminals; ++i) {
    for (int j = 0; j < c.terminals; ++j) {
      const double scale =
          model_.nominal_kv[at(c.bus[i])] * model_.nominal_kv[at(c.bus[j])] / model_.base_mva;
      model_.block_y.push_back(
          {c.y_siemens[0][i][j] * scale, c.y_siemens[1][i][j] * scale, c.y_siemens[2][i][j] * scale});
    }
  }
  block.earthed = c.earthed;
  model_.blocks.push_back(block);
  join(c);
}

void Builder::add_sources() {
  const auto add = [&](ElementRef ref, BusIndex bus, const BySequence<std::optional<Complex>>& z_ohm) {
    add_block(ref, [&](Part part) {
      BySequence<std::optional<Complex>> z = z_ohm;
      for (auto& one : z)
        if (one) one = part_of(*one, part);
      Circuit circuit = shunt_circuit(bus, z);
      circuit.neutral_earthed[0] = ref.kind == ElementKind::synchronous_machine && z_ohm[kZero];
      return circuit;
    });
    positive_->mark(model_.node_of_bus[at(bus)]);
  };
  for (std::uint32_t i = 0; i < network_.network_feeders.size(); ++i) {
    const NetworkFeeder& feeder = network_.network_feeders[i];
    if (!is_live(network_, feeder, feeder.bus)) continue;
    const ElementRef ref{ElementKind::network_feeder, i};
    if (const auto z =
            feeder_impedance_ohm(level_in_use(network_, feeder), network_.bus(feeder.bus).nominal_kv)) {
      add(ref, feeder.bus, *z);
    } else {
      findings_.push_back({Severity::error, ref, "line_to_ground_ka",
                           "no zero-sequence impedance follows from it",
                           "must be below 1.5 times the three-phase level, less where the angles differ",
                           "ask the grid operator which of its figures the level is"});
    }
  }
  for (std::uint32_t i = 0; i < network_.synchronous_machines.size(); ++i) {
    const SynchronousMachine& machine = network_.synchronous_machines[i];
    if (is_live(network_, machine, machine.bus))
      add({ElementKind::synchronous_machine, i}, machine.bus, machine_impedance_ohm(machine));
  }
  for (std::uint32_t i = 0; i < network_.induction_motors.size(); ++i) {
    const InductionMotor& motor = network_.induction_motors[i];
    if (is_live(network_, motor, motor.bus) && motor.drives_fault_current())
      add({ElementKind::induction_motor, i}, motor.bus, motor_impedance_ohm(motor));
  }
  for (std::uint32_t i = 0; i < network_.inverter_sources.size(); ++i) {
    const InverterSource& source = network_.inverter_sources[i];
    if (!is_live(network_, source, source.bus) || !source.doubly_fed) continue;
    const Complex z = doubly_fed_impedance_ohm(source.rated_kv, *source.doubly_fed);
    add({ElementKind::inverter_source, i}, source.bus, {std::nullopt, z, z});
  }
}

void Builder::add_lines() {
  const auto stays = [&](const Line& line) {
    return is_live(network_, line, line.from, line.to) || line.earthed_when_out.value_or(false);
  };
  // Groups of lines that couplings hang together.
  Islands coupled(network_.lines.size());
  std::vector<std::uint32_t> used;
  std::vector<bool> in_group(network_.lines.size(), false);
  for (std::uint32_t i = 0; i < network_.mutual_couplings.size(); ++i) {
    const MutualCoupling& m = network_.mutual_couplings[i];
    if (!m.is_in_service() || !stays(network_.lines[m.line_a]) || !stays(network_.lines[m.line_b])) continue;
    coupled.join(static_cast<Node>(m.line_a), static_cast<Node>(m.line_b));
    in_group[m.line_a] = in_group[m.line_b] = true;
    used.push_back(i);
  }

  for (std::uint32_t i = 0; i < network_.lines.size(); ++i) {
    const Line& line = network_.lines[i];
    if (!is_live(network_, line, line.from, line.to)) continue;
    const auto z = line_impedance_ohm(line);
    const auto charging = line_charging_siemens(line);
    add_block({ElementKind::line, i}, [&](Part part) {
      Circuit circuit =
          series_circuit(line.from, line.to, {part_of(z[0], part), part_of(z[1], part), part_of(z[2], part)});
      if (in_group[i]) circuit.y_siemens[kZero] = {};
      for (int s = 0; s < 3; ++s) {
        if (charging[s] == Complex(0) || (s != kZero && !options_.include_shunts)) continue;
        const Complex half = 0.5 / part_of_shunt(1.0 / charging[s], part);
        for (int end = 0; end < 2; ++end) circuit.y_siemens[s][end][end] += half;
        circuit.earthed[s] = true;
      }
      return circuit;
    });
    links_.push_back(
        {model_.node_of_bus[at(line.from)], model_.node_of_bus[at(line.to)], 0, {ElementKind::line, i}});
  }

  std::vector<std::vector<std::uint32_t>> members(network_.lines.size()), couplings(network_.lines.size());
  for (std::uint32_t i = 0; i < network_.lines.size(); ++i)
    if (in_group[i]) members[at(coupled.representative(static_cast<Node>(i)))].push_back(i);
  for (const auto i : used)
    couplings[at(coupled.representative(static_cast<Node>(network_.mutual_couplings[i].line_a)))].push_back(
        i);
  for (std::size_t g = 0; g < members.size(); ++g)
    if (!members[g].empty()) add_coupled_group(members[g], couplings[g]);
}

void Builder::add_coupled_group(const std::vector<std::uint32_t>& members,
                                const std::vector<std::uint32_t>& couplings) {
  const auto m = static_cast<Eigen::Index>(members.size());
  const auto position = [&](std::uint32_t line) {
    return std::lower_bound(members.begin(), members.end(), line) - members.begin();
  };
  Eigen::MatrixXcd z = Eigen::MatrixXcd::Zero(m, m);
  for (Eigen::Index k = 0; k < m; ++k) z(k, k) = line_impedance_ohm(network_.lines[members[k]])[kZero];
  for (const auto i : couplings) {
    const MutualCoupling& c = network_.mutual_couplings[i];
    const Complex zm = c.orientation.value_or(1) * c.length_km * Complex(c.r0m_ohm_per_km, c.x0m_ohm_per_km);
    z(position(c.line_a), position(c.line_b)) += zm;
    z(position(c.line_b), position(c.line_a)) += zm;
  }
  const Eigen::MatrixXcd y = z.inverse();

  std::vector<CoupledEnd> ends;
  Block block{static_cast<std::uint32_t>(model_.block_terminals.size()), 0,
              static_cast<std::uint32_t>(model_.block_y.size())};
  for (Eigen::Index k = 0; k < m; ++k) {
    const Line& line = network_.lines[members[k]];
    if (!is_live(network_, line, line.from, line.to)) continue;
    ends.push_back({k, line.from, 1});
    ends.push_back({k, line.to, -1});
    const ElementRef ref{ElementKind::line, members[k]};
    // The line's own block stands in order of its index; its two terminals follow each other.
    const auto own = std::lower_bound(model_.terminals.begin(), model_.terminals.end(), ref,
                                      [](const Terminal& t, const ElementRef& r) { return t.element < r; }) -
                     model_.terminals.begin();
    model_.block_terminals.push_back(static_cast<std::uint32_t>(own));
    model_.block_terminals.push_back(static_cast<std::uint32_t>(own) + 1);
  }
  block.count = static_cast<std::uint32_t>(ends.size());
  add_coupled_y(y, ends, Part::whole);
  if (options_.separate_parts) {
    Eigen::MatrixXcd x = z, resistance = z;
    for (Eigen::Index i = 0; i < m; ++i)
      for (Eigen::Index j = 0; j < m; ++j) {
        x(i, j) = Complex(0, z(i, j).imag());
        resistance(i, j) = i == j ? part_of(z(i, j), Part::resistance) : z(i, j).real();
      }
    add_coupled_y(x.inverse(), ends, Part::reactance);
    add_coupled_y(resistance.inverse(), ends, Part::resistance);
  }
  for (Eigen::Index k = 0; k < m; ++k) {
    const Line& line = network_.lines[members[k]];
    if (is_live(network_, line, line.from, line.to)) continue;
    InducedLine induced{{ElementKind::line, members[k]}, line.from, {}, {}};
    for (std::size_t e = 0; e < ends.size(); ++e) {
      induced.ends.push_back(model_.block_terminals[block.first + e]);
      const double scale =
          model_.nominal_kv[at(line.from)] * model_.nominal_kv[at(ends[e].bus)] / model_.base_mva;
      induced.y.push_back(ends[e].sign * y(k, ends[e].line) * scale);
    }
    model_.induced_lines.push_back(std::move(induced));
  }
  block.coupling = true;
  model_.blocks.push_back(block);
}

// Part::whole adds the block's entries, the others fill theirs in.
void Builder::add_coupled_y(const Eigen::MatrixXcd& y, const std::vector<CoupledEnd>& ends, Part part) {
  const std::size_t count = ends.size() * ends.size();
  if (part == Part::reactance) model_.block_parts.resize(model_.block_parts.size() + count);
  std::size_t place = model_.block_parts.size() - (part == Part::whole ? 0 : count);
  for (const CoupledEnd& a : ends)
    for (const CoupledEnd& b : ends) {
      const double scale = model_.nominal_kv[at(a.bus)] * model_.nominal_kv[at(b.bus)] / model_.base_mva;
      const Complex entry = a.sign * b.sign * y(a.line, b.line) * scale;
      if (part == Part::whole)
        model_.block_y.push_back({entry, 0, 0});
      else if (part == Part::reactance)
        model_.block_parts[place++].x0 = -entry.imag();
      else
        model_.block_parts[place++].r0 = entry.real();
    }
}

void Builder::add_transformers() {
  const auto link = [&](BusIndex hv, BusIndex lower, int clock, ElementRef ref) {
    links_.push_back(
        {model_.node_of_bus[at(hv)], model_.node_of_bus[at(lower)], static_cast<std::uint8_t>(clock), ref});
  };
  for (std::uint32_t i = 0; i < network_.transformers.size(); ++i) {
    const Transformer& t = network_.transformers[i];
    if (!is_live(network_, t, t.hv_bus, t.lv_bus)) continue;
    const ElementRef ref{ElementKind::transformer, i};
    add_block(ref, [&](Part part) { return transformer_circuit(t, part); });
    link(t.hv_bus, t.lv_bus, t.vector_group.lower[0].clock, ref);
  }
  for (std::uint32_t i = 0; i < network_.three_winding_transformers.size(); ++i) {
    const ThreeWindingTransformer& given = network_.three_winding_transformers[i];
    if (!is_live(network_, given, given.hv_bus, given.mv_bus)) continue;
    const bool lv_dead = given.lv_bus && !network_.bus(*given.lv_bus).is_in_service();
    ThreeWindingTransformer t = given;
    if (lv_dead) t.lv_bus.reset();
    const ElementRef ref{ElementKind::three_winding_transformer, i};
    add_block(ref, [&](Part part) { return three_winding_circuit(t, part); });
    link(t.hv_bus, t.mv_bus, t.vector_group.lower[0].clock, ref);
    if (t.lv_bus) link(t.hv_bus, *t.lv_bus, t.vector_group.lower[1].clock, ref);
  }
}

void Builder::add_rest() {
  for (std::uint32_t i = 0; i < network_.earthing_transformers.size(); ++i) {
    const EarthingTransformer& e = network_.earthing_transformers[i];
    const auto neutral = triple_neutral_ohm(e.neutral);
    if (!is_live(network_, e, e.bus) || !neutral) continue;
    add_block({ElementKind::earthing_transformer, i}, [&](Part part) {
      const Complex z = part_of(Complex(e.r0_ohm, e.x0_ohm) + *neutral, part);
      Circuit circuit = shunt_circuit(e.bus, {z, std::nullopt, std::nullopt});
      circuit.neutral_earthed[0] = true;
      return circuit;
    });
  }
  for (std::uint32_t i = 0; i < network_.series_reactors.size(); ++i) {
    const SeriesReactor& r = network_.series_reactors[i];
    if (!is_live(network_, r, r.from, r.to)) continue;
    const ElementRef ref{ElementKind::series_reactor, i};
    add_block(ref, [&](Part part) {
      const Complex z = part_of(reactor_impedance_ohm(r), part);
      return series_circuit(r.from, r.to, {z, z, z});
    });
    links_.push_back({model_.node_of_bus[at(r.from)], model_.node_of_bus[at(r.to)], 0, ref});
  }
  for (std::uint32_t i = 0; i < network_.shunts.size(); ++i) {
    const Shunt& shunt = network_.shunts[i];
    const bool grounded = shunt.grounded.value_or(false);
    if (!is_live(network_, shunt, shunt.bus) || (!grounded && !options_.include_shunts)) continue;
    add_block({ElementKind::shunt, i}, [&](Part part) {
      const Complex z = part_of_shunt({0, -shunt.rated_kv * shunt.rated_kv / shunt.mvar}, part);
      const std::optional<Complex> series = options_.include_shunts ? std::optional(z) : std::nullopt;
      return shunt_circuit(shunt.bus, {grounded ? std::optional(z) : std::nullopt, series, series});
    });
  }
}

void Builder::finish_islands() {
  const std::size_t nodes = model_.node_count();
  const auto lag = detail::lag_clocks(network_, nodes, links_);
  model_.lag_clock.assign(network_.buses.size(), 0);
  for (std::size_t b = 0; b < network_.buses.size(); ++b)
    if (model_.node_of_bus[b] != Node::none) model_.lag_clock[b] = lag[at(model_.node_of_bus[b])];
  model_.has_source.resize(nodes);
  model_.has_zero_path.resize(nodes);
  model_.zero_island.resize(nodes);
  model_.zero_ratio.resize(nodes);
  for (std::size_t n = 0; n < nodes; ++n) {
    model_.has_source[n] = positive_->is_marked(static_cast<Node>(n));
    model_.has_zero_path[n] = zero_->is_marked(static_cast<Node>(n));
    model_.zero_island[n] = zero_->representative(static_cast<Node>(n));
    model_.zero_ratio[n] = zero_->ratio(static_cast<Node>(n));
  }
  model_.pinned[kPositive] = model_.pinned[kNegative] = positive_->unmarked_representatives();
  model_.pinned[kZero] = zero_->unmarked_representatives();
}

void Builder::sort_terminals() {
  const std::size_t count = model_.terminals.size();
  std::vector<std::uint32_t> order(count), place(count);
  std::iota(order.begin(), order.end(), 0U);
  std::stable_sort(order.begin(), order.end(), [&](auto a, auto b) {
    const Terminal &x = model_.terminals[a], &y = model_.terminals[b];
    return x.node != y.node ? x.node < y.node : x.element < y.element;
  });
  std::vector<Terminal> sorted(count);
  model_.terminal_start.assign(model_.node_count() + 1, 0);
  for (std::uint32_t k = 0; k < count; ++k) {
    sorted[k] = model_.terminals[order[k]];
    place[order[k]] = k;
    ++model_.terminal_start[at(sorted[k].node)];
  }
  std::exclusive_scan(model_.terminal_start.begin(), model_.terminal_start.end(),
                      model_.terminal_start.begin(), 0U);
  model_.terminals = std::move(sorted);
  for (auto& t : model_.block_terminals) t = place[t];
  for (auto& line : model_.induced_lines)
    for (auto& t : line.ends) t = place[t];
}

}  // namespace

SequenceModel build_sequence_model(const Network& network, const SequenceOptions& options) {
  return Builder(network, options).build();
}

}  // namespace kiloamp
