#include "engine/fault/fault_network.hpp"

#include <Eigen/LU>
#include <algorithm>
#include <cassert>
#include <numeric>

namespace kiloamp::detail {

namespace {

void add_product(BySequence<Complex>& sum, const BySequence<Complex>& a, const BySequence<Complex>& b) {
  for (int s = 0; s < 3; ++s) sum[s] += a[s] * b[s];
}

}  // namespace

FaultNetwork::FaultNetwork(const SequenceModel& model, int threads, const FaultNetwork* like)
    : model_(&model) {
  slots_.resize(model.terminals.size());
  for (std::uint32_t b = 0; b < model.blocks.size(); ++b) {
    const Block& block = model.blocks[b];
    for (std::uint32_t p = 0; p < block.count; ++p) {
      auto& slots = slots_[model.block_terminals[block.first + p]];
      slots[slots[0].used ? 1 : 0] = {b, p, true};
    }
  }
  assemble(threads, like);
  prepare_switches();
}

void FaultNetwork::assemble(int threads, const FaultNetwork* like) {
  const SequenceModel& m = *model_;
  const std::size_t n = m.node_count();
  const auto node_at = [&](const Block& b, std::uint32_t p) {
    return static_cast<sparse::Index>(m.terminals[m.block_terminals[b.first + p]].node);
  };
  for (const Block& block : m.blocks)
    for (std::uint32_t p = 0; p < block.count; ++p)
      for (std::uint32_t q = p + 1; q < block.count; ++q) {
        const auto [i, j] = std::minmax({node_at(block, p), node_at(block, q)});
        if (i != j) edges_.push_back({i, j});
      }
  const auto order = [](const sparse::Edge& e) { return std::pair(e.i, e.j); };
  std::sort(edges_.begin(), edges_.end(), [&](const auto& a, const auto& b) { return order(a) < order(b); });
  edges_.erase(std::unique(edges_.begin(), edges_.end(),
                           [&](const auto& a, const auto& b) { return order(a) == order(b); }),
               edges_.end());
  edge_start_.assign(n + 1, 0);
  for (const auto& e : edges_) ++edge_start_[static_cast<std::size_t>(e.i) + 1];
  std::partial_sum(edge_start_.begin(), edge_start_.end(), edge_start_.begin());

  sparse::Values<Complex, 3> values = empty_values();
  for (const Block& block : m.blocks) {
    for (std::uint32_t p = 0; p < block.count; ++p) {
      for (std::uint32_t q = 0; q < block.count; ++q) {
        const auto i = node_at(block, p), j = node_at(block, q);
        const auto& y = m.block_y[block.first_y + p * block.count + q];
        if (i != j && q < p) continue;
        auto& place = i == j ? values.diagonal[static_cast<std::size_t>(i)]
                             : values.off_diagonal[static_cast<std::size_t>(
                                   edge_between(static_cast<Node>(i), static_cast<Node>(j)))];
        for (int s = 0; s < 3; ++s) place[s] += y[s];
      }
    }
  }
  for (int s = 0; s < 3; ++s) pin(m.pinned[s], s, values);
  const auto same = [](const auto& entry) { return entry[kPositive] == entry[kNegative]; };
  negative_is_positive_ = std::all_of(values.diagonal.begin(), values.diagonal.end(), same) &&
                          std::all_of(values.off_diagonal.begin(), values.off_diagonal.end(), same);
  const auto same_edge = [&](const auto& a, const auto& b) { return order(a) == order(b); };
  const bool alike =
      like != nullptr && like->model_->node_count() == n &&
      std::equal(edges_.begin(), edges_.end(), like->edges_.begin(), like->edges_.end(), same_edge);
  analysis_ = alike ? like->analysis_
                    : std::make_shared<const sparse::Analysis>(static_cast<sparse::Index>(n), edges_);
  factors_ = std::make_unique<sparse::Factorisation<Complex, 3>>(analysis_, values, threads);
  inverse_ = factors_->selected_inverse(threads);
}

sparse::Values<Complex, 3> FaultNetwork::empty_values() const {
  sparse::Values<Complex, 3> values;
  values.diagonal.resize(model_->node_count());
  values.off_diagonal.resize(edges_.size());
  return values;
}

void FaultNetwork::put_positive(const SequenceModel& m, int lane, sparse::Values<Complex, 3>& values) const {
  const auto s = static_cast<std::size_t>(lane);
  for (const Block& block : m.blocks) {
    if (block.coupling) continue;  // zero sequence only
    for (std::uint32_t p = 0; p < block.count; ++p) {
      const Node i = m.terminals[m.block_terminals[block.first + p]].node;
      for (std::uint32_t q = p; q < block.count; ++q) {
        const Node j = m.terminals[m.block_terminals[block.first + q]].node;
        const Complex y = m.block_y[block.first_y + p * block.count + q][kPositive];
        if (i == j)
          values.diagonal[at(i)][s] += p == q ? y : 2.0 * y;
        else
          values.off_diagonal[static_cast<std::size_t>(edge_between(i, j))][s] += y;
      }
    }
  }
  pin(m.pinned[kPositive], lane, values);
}

sparse::Values<double, 4> FaultNetwork::separate_values() const {
  const SequenceModel& m = *model_;
  assert(m.block_parts.size() == m.block_y.size());
  sparse::Values<double, 4> values;
  values.diagonal.resize(m.node_count());
  values.off_diagonal.resize(edges_.size());
  for (const Block& block : m.blocks)
    for (std::uint32_t p = 0; p < block.count; ++p) {
      const Node i = m.terminals[m.block_terminals[block.first + p]].node;
      for (std::uint32_t q = p; q < block.count; ++q) {
        const Node j = m.terminals[m.block_terminals[block.first + q]].node;
        const SeparateParts& y = m.block_parts[block.first_y + p * block.count + q];
        auto& place = i == j ? values.diagonal[at(i)]
                             : values.off_diagonal[static_cast<std::size_t>(edge_between(i, j))];
        const double times = i == j && p != q ? 2 : 1;
        place[0] += times * y.x1;
        place[1] += times * y.x0;
        place[2] += times * y.r1;
        place[3] += times * y.r0;
      }
    }
  for (int lane = 0; lane < 4; ++lane) pin(m.pinned[lane % 2 == 0 ? kPositive : kZero], lane, values);
  return values;
}

// Potential 0 at each of the nodes in one lane: its own equation, and no part in the others'.
template <typename Values>
void FaultNetwork::pin(const std::vector<Node>& nodes, int lane, Values& values) const {
  const auto s = static_cast<std::size_t>(lane);
  std::vector<bool> pinned(values.diagonal.size(), false);
  for (const Node node : nodes) {
    pinned[at(node)] = true;
    values.diagonal[at(node)][s] = 1.0;
  }
  for (std::size_t e = 0; e < edges_.size(); ++e)
    if (pinned[static_cast<std::size_t>(edges_[e].i)] || pinned[static_cast<std::size_t>(edges_[e].j)])
      values.off_diagonal[e][s] = 0.0;
}

std::int32_t FaultNetwork::edge_between(Node a, Node b) const {
  const auto [i, j] = std::minmax({static_cast<sparse::Index>(a), static_cast<sparse::Index>(b)});
  const auto first = edges_.begin() + edge_start_[static_cast<std::size_t>(i)];
  const auto last = edges_.begin() + edge_start_[static_cast<std::size_t>(i) + 1];
  const auto found =
      std::lower_bound(first, last, j, [](const sparse::Edge& e, sparse::Index want) { return e.j < want; });
  assert(found != last && found->j == j);
  return static_cast<std::int32_t>(found - edges_.begin());
}

void FaultNetwork::prepare_switches() {
  const SequenceModel& m = *model_;
  group_of_node_.assign(m.node_count(), -1);
  for (std::uint32_t i = 0; i < m.closed_switches.size(); ++i) {
    const Node node = m.node_of_bus[at(m.closed_switches[i].from)];
    auto& group = group_of_node_[at(node)];
    if (group < 0) {
      group = static_cast<std::int32_t>(groups_.size());
      groups_.emplace_back();
    }
    const auto buses = m.buses_of(node);
    const auto position = [&](BusIndex bus) {
      return static_cast<std::uint32_t>(std::lower_bound(buses.begin(), buses.end(), bus) - buses.begin());
    };
    SwitchGroup& g = groups_[static_cast<std::size_t>(group)];
    g.switches.push_back(i);
    g.ends.emplace_back(position(m.closed_switches[i].from), position(m.closed_switches[i].to));
  }
  for (std::size_t node = 0; node < group_of_node_.size(); ++node) {
    if (group_of_node_[node] < 0) continue;
    SwitchGroup& g = groups_[static_cast<std::size_t>(group_of_node_[node])];
    const auto reduced = static_cast<Eigen::Index>(m.buses_of(static_cast<Node>(node)).size()) - 1;
    Eigen::MatrixXd laplacian = Eigen::MatrixXd::Zero(reduced, reduced);
    for (const auto& [from, to] : g.ends) {
      const auto f = static_cast<Eigen::Index>(from) - 1, t = static_cast<Eigen::Index>(to) - 1;
      if (f >= 0) laplacian(f, f) += 1;
      if (t >= 0) laplacian(t, t) += 1;
      if (f >= 0 && t >= 0) {
        laplacian(f, t) -= 1;
        laplacian(t, f) -= 1;
      }
    }
    const Eigen::MatrixXd inverse = laplacian.inverse();
    g.inverse.assign(inverse.data(),
                     inverse.data() + inverse.size());  // symmetric: storage order does not matter
  }
}

BySequence<Complex> FaultNetwork::z_to(Node j, Node k, const Reach& reach) const {
  if (!reach.column.empty()) return reach.column[at(j)];
  return j == k ? inverse_.diagonal[at(k)]
                : inverse_.off_diagonal[static_cast<std::size_t>(edge_between(j, k))];
}

BySequence<Complex> FaultNetwork::share_of(std::uint32_t terminal, Node k, const Reach& reach) const {
  const SequenceModel& m = *model_;
  BySequence<Complex> share{};
  for (const Slot& slot : slots_[terminal]) {
    if (!slot.used) continue;
    const Block& block = m.blocks[slot.block];
    for (std::uint32_t q = 0; q < block.count; ++q)
      add_product(share, m.block_y[block.first_y + slot.position * block.count + q],
                  z_to(m.terminals[m.block_terminals[block.first + q]].node, k, reach));
  }
  return share;
}

void FaultNetwork::add_terminal_shares(BusIndex bus, BusIndex fault_bus, Node k, Reach& reach) const {
  const SequenceModel& m = *model_;
  const Node node = m.node_of_bus[at(bus)];
  for (std::uint32_t t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
    const Terminal& terminal = m.terminals[t];
    if (terminal.bus != bus) continue;
    const auto share = share_of(t, k, reach);
    reach.currents.push_back({terminal.element, bus, share, bus == fault_bus});
    if (terminal.neutral == NeutralPath::none) continue;
    Complex ka = share[kZero] * m.base_ka(bus);
    if (terminal.neutral == NeutralPath::shared) {
      const bool listed = std::any_of(reach.neutrals.begin(), reach.neutrals.end(),
                                      [&](const NeutralShare& n) { return n.element == terminal.element; });
      if (listed) continue;
      const Block& block = m.blocks[slots_[t][0].block];
      const std::uint32_t other = m.block_terminals[block.first + (slots_[t][0].position == 0 ? 1 : 0)];
      ka += share_of(other, k, reach)[kZero] * m.base_ka(m.terminals[other].bus);
    }
    reach.neutrals.push_back({terminal.element, bus, ka});
  }
}

// Lines out of service and earthed at both ends, when a line they are coupled with ends at a bus in reach.
void FaultNetwork::add_induced_shares(Node k, Reach& reach) const {
  const SequenceModel& m = *model_;
  for (const InducedLine& line : m.induced_lines) {
    const bool near = std::any_of(line.ends.begin(), line.ends.end(), [&](std::uint32_t t) {
      return std::any_of(reach.voltages.begin(), reach.voltages.end(),
                         [&](const VoltageShare& v) { return v.bus == m.terminals[t].bus; });
    });
    if (!near) continue;
    // Delta V = -Z I drives y Delta V from `from` to `to`; into the bus at `from` flows its negative.
    Complex share = 0;
    for (std::size_t e = 0; e < line.ends.size(); ++e)
      share += line.y[e] * z_to(m.terminals[line.ends[e]].node, k, reach)[kZero];
    reach.currents.push_back({line.element, line.from, {share, 0, 0}, false});
  }
}

// Potentials phi of the buses of a group when every switch has the same small resistance, so that loops of
// switches share by the limit of equal resistances and a tree carries what the balance at its buses asks: L
// phi = injections, current from -> to = phi_f - phi_t.
void FaultNetwork::add_switch_shares(BusIndex bus, BusIndex fault_bus, Node k, Reach& reach) const {
  const SequenceModel& m = *model_;
  const Node node = m.node_of_bus[at(bus)];
  const std::int32_t index = group_of_node_[at(node)];
  if (index < 0) return;
  const SwitchGroup& group = groups_[static_cast<std::size_t>(index)];
  const auto buses = m.buses_of(node);
  const auto position = [&](BusIndex b) {
    return static_cast<std::size_t>(std::lower_bound(buses.begin(), buses.end(), b) - buses.begin());
  };
  std::vector<BySequence<Complex>> injection(buses.size()), phi(buses.size());
  for (std::uint32_t t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
    const auto share = share_of(t, k, reach);
    auto& sum = injection[position(m.terminals[t].bus)];
    for (int s = 0; s < 3; ++s) sum[s] += share[s];
  }
  if (node == k)
    for (int s = 0; s < 3; ++s) injection[position(fault_bus)][s] -= 1.0;
  const std::size_t reduced = buses.size() - 1;
  for (std::size_t i = 0; i < reduced; ++i)
    for (std::size_t j = 0; j < reduced; ++j)
      for (int s = 0; s < 3; ++s) phi[i + 1][s] += group.inverse[i * reduced + j] * injection[j + 1][s];
  const std::size_t here = position(bus);
  for (std::size_t i = 0; i < group.switches.size(); ++i) {
    const auto [from, to] = group.ends[i];
    if (from != here && to != here) continue;
    const std::size_t other = from == here ? to : from;
    BySequence<Complex> share;
    for (int s = 0; s < 3; ++s) share[s] = phi[other][s] - phi[here][s];
    reach.currents.push_back({m.closed_switches[group.switches[i]].element, bus, share, bus == fault_bus});
  }
}

std::vector<BusIndex> FaultNetwork::buses_within(BusIndex bus, int depth) const {
  const SequenceModel& m = *model_;
  std::vector<BusIndex> found{bus};
  std::vector<BusIndex> seen{bus};  // sorted
  const auto visit = [&](BusIndex b) {
    const auto place = std::lower_bound(seen.begin(), seen.end(), b);
    if (place != seen.end() && *place == b) return;
    seen.insert(place, b);
    found.push_back(b);
  };
  std::size_t first = 0;
  for (int step = 0; step < depth; ++step) {
    const std::size_t last = found.size();
    for (; first < last; ++first) {
      const BusIndex b = found[first];
      const Node node = m.node_of_bus[at(b)];
      for (std::uint32_t t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
        if (m.terminals[t].bus != b) continue;
        const Block& block = m.blocks[slots_[t][0].block];
        for (std::uint32_t q = 0; q < block.count; ++q)
          visit(m.terminals[m.block_terminals[block.first + q]].bus);
      }
      if (group_of_node_[at(node)] < 0) continue;
      for (const auto s : groups_[static_cast<std::size_t>(group_of_node_[at(node)])].switches) {
        if (m.closed_switches[s].from == b) visit(m.closed_switches[s].to);
        if (m.closed_switches[s].to == b) visit(m.closed_switches[s].from);
      }
    }
  }
  return found;
}

void FaultNetwork::reach(BusIndex bus, int depth, Reach& reach) const {
  const SequenceModel& m = *model_;
  const Node k = m.node_of_bus[at(bus)];
  reach.currents.clear();
  reach.voltages.clear();
  reach.neutrals.clear();
  reach.column.clear();
  if (depth > 0) {
    reach.column.resize(m.node_count());
    factors_->column(static_cast<sparse::Index>(k), reach.column);
  }
  for (const BusIndex b : buses_within(bus, depth)) {
    add_terminal_shares(b, bus, k, reach);
    add_switch_shares(b, bus, k, reach);
    const Node j = m.node_of_bus[at(b)];
    const bool shifts = !m.has_zero_path[at(k)] && m.zero_island[at(j)] == m.zero_island[at(k)];
    reach.voltages.push_back(
        {b, z_to(j, k, reach), shifts ? m.zero_ratio[at(j)] / m.zero_ratio[at(k)] : 0.0});
  }
  if (depth > 0) add_induced_shares(k, reach);
}

}  // namespace kiloamp::detail
