#include "engine/study/outage_change.hpp"

#include <algorithm>
#include <map>

namespace kiloamp::detail {

namespace {

// What is left of C below this part of its largest entry is round-off of the eliminations that made it.
constexpr double kRankTolerance = 1e-12;

// C = sum d u u^T with the largest diagonal entry as pivot; false when only off-diagonal entries are left.
bool factor(Eigen::MatrixXcd c, std::vector<std::vector<Complex>>& u, std::vector<Complex>& d) {
  const double largest = c.size() > 0 ? c.cwiseAbs().maxCoeff() : 0;
  while (c.size() > 0 && c.cwiseAbs().maxCoeff() > kRankTolerance * largest) {
    Eigen::Index p = 0;
    if (!(c.diagonal().cwiseAbs().maxCoeff(&p) > kRankTolerance * largest)) return false;
    const Eigen::VectorXcd column = c.col(p) / c(p, p);
    d.push_back(c(p, p));
    u.emplace_back(column.data(), column.data() + column.size());
    c -= d.back() * column * column.transpose();
    c.col(p).setZero();
    c.row(p).setZero();
  }
  return true;
}

bool is_pinned(const SequenceModel& model, int sequence, Node node) {
  const auto& pinned = model.pinned[sequence];
  return std::binary_search(pinned.begin(), pinned.end(), node);
}

class Builder {
 public:
  Builder(const SequenceModel& model, const FaultNetwork& solved, OutageChange& change)
      : model_(model), solved_(solved), change_(change) {
    for (auto& c : c_) c = Eigen::MatrixXcd::Zero(0, 0);
  }

  std::uint32_t place(Node node) {
    const auto found = std::find(change_.nodes.begin(), change_.nodes.end(), node);
    if (found != change_.nodes.end()) return static_cast<std::uint32_t>(found - change_.nodes.begin());
    change_.nodes.push_back(node);
    const auto size = static_cast<Eigen::Index>(change_.nodes.size());
    for (auto& c : c_) c.conservativeResizeLike(Eigen::MatrixXcd::Zero(size, size));
    return static_cast<std::uint32_t>(size - 1);
  }
  Node node_at(const Block& block, std::uint32_t position) const {
    return model_.terminals[model_.block_terminals[block.first + position]].node;
  }
  const BySequence<Complex>& y(const Block& block, std::uint32_t p, std::uint32_t q) const {
    return model_.block_y[block.first_y + p * block.count + q];
  }

  void remove_block(const Block& block) {
    for (std::uint32_t p = 0; p < block.count; ++p)
      for (std::uint32_t q = 0; q < block.count; ++q)
        add(node_at(block, p), node_at(block, q), y(block, p, q));
  }

  // The group keeps y of its other lines: without line k, y' = y - y_k y_k^T / y_kk; earthed at both ends, y'
  // only loses the line's terminals.
  void remove_from_group(const Block& block, std::uint32_t end, bool earthed) {
    if (earthed) {
      for (std::uint32_t p = 0; p < block.count; ++p)
        for (std::uint32_t q = 0; q < block.count; ++q)
          if (p / 2 == end / 2 || q / 2 == end / 2) add(node_at(block, p), node_at(block, q), y(block, p, q));
      return;
    }
    const Complex y_kk = y(block, end, end)[kZero];
    for (std::uint32_t p = 0; p < block.count; ++p)
      for (std::uint32_t q = 0; q < block.count; ++q)
        add(node_at(block, p), node_at(block, q),
            {y(block, p, end)[kZero] * y(block, end, q)[kZero] / y_kk, 0, 0});
  }

  bool finish() {
    for (int s = 0; s < 3; ++s) {
      // A pinned node has no equation of its own.
      for (std::size_t k = 0; k < change_.nodes.size(); ++k) {
        if (!is_pinned(model_, s, change_.nodes[k])) continue;
        c_[s].row(static_cast<Eigen::Index>(k)).setZero();
        c_[s].col(static_cast<Eigen::Index>(k)).setZero();
      }
      if (!factor(c_[s], change_.u[s], change_.d[s])) return false;
      change_.rank[s] = static_cast<int>(change_.d[s].size());
    }
    return true;
  }

 private:
  void add(Node a, Node b, const BySequence<Complex>& value) {
    const auto i = place(a), j = place(b);
    for (int s = 0; s < 3; ++s) c_[s](i, j) += value[s];
  }

  const SequenceModel& model_;
  const FaultNetwork& solved_;
  OutageChange& change_;
  BySequence<Eigen::MatrixXcd> c_;
};

// The buses that stay on `from`'s side when switch `opened` opens; empty when the others still join both
// ends.
std::vector<BusIndex> near_side(const SequenceModel& model, const MergedSwitch& opened) {
  std::vector<BusIndex> side{opened.from};
  const Node node = model.node_of_bus[at(opened.from)];
  for (std::size_t k = 0; k < side.size(); ++k)
    for (const MergedSwitch& s : model.closed_switches) {
      if (s.element == opened.element || model.node_of_bus[at(s.from)] != node) continue;
      for (const auto& [here, there] : {std::pair{s.from, s.to}, std::pair{s.to, s.from}})
        if (here == side[k] && std::find(side.begin(), side.end(), there) == side.end())
          side.push_back(there);
    }
  if (std::find(side.begin(), side.end(), opened.to) != side.end()) return {};
  return side;
}

std::optional<OutageChange> coupler_change(const SequenceModel& model, const FaultNetwork& solved,
                                           const MergedSwitch& opened) {
  const auto near = near_side(model, opened);
  if (near.empty()) return std::nullopt;
  OutageChange change;
  change.element = opened.element;
  const Node node = model.node_of_bus[at(opened.from)];
  change.split.emplace();
  change.split->node = node;
  for (const BusIndex bus : model.buses_of(node))
    if (std::find(near.begin(), near.end(), bus) == near.end()) change.split->far_buses.push_back(bus);
  const auto& far = change.split->far_buses;
  const auto is_far = [&](std::uint32_t t) {
    return model.terminals[t].node == node &&
           std::binary_search(far.begin(), far.end(), model.terminals[t].bus);
  };
  std::map<Node, BySequence<Complex>> c;
  c[node] = {};
  BySequence<Complex> own{};
  for (std::uint32_t t = model.terminal_start[at(node)]; t < model.terminal_start[at(node) + 1]; ++t) {
    if (!is_far(t)) continue;
    for (const auto& slot : solved.slots(t)) {
      if (!slot.used) continue;
      const Block& block = model.blocks[slot.block];
      for (std::uint32_t q = 0; q < block.count; ++q) {
        const std::uint32_t other = model.block_terminals[block.first + q];
        const auto& y = model.block_y[block.first_y + slot.position * block.count + q];
        for (int s = 0; s < 3; ++s) {
          c[model.terminals[other].node][s] += y[s];
          if (is_far(other)) own[s] += y[s];
        }
      }
    }
  }
  for (int s = 0; s < 3; ++s) {
    change.rank[s] = 1;
    change.d[s] = {own[s]};
    change.u[s].emplace_back();
  }
  for (const auto& [place, value] : c) {
    if (place == node) change.own.push_back(static_cast<std::uint32_t>(change.nodes.size()));
    change.nodes.push_back(place);
    for (int s = 0; s < 3; ++s) change.u[s][0].push_back(is_pinned(model, s, place) ? Complex(0) : value[s]);
  }
  return change;
}

}  // namespace

std::optional<OutageChange> outage_change(const Network& network, const SequenceModel& model,
                                          const FaultNetwork& solved, ElementRef ref,
                                          std::span<const std::uint32_t> terminals, bool earthed) {
  if (ref.kind == ElementKind::bus_switch) {
    const auto found = std::find_if(model.closed_switches.begin(), model.closed_switches.end(),
                                    [&](const MergedSwitch& s) { return s.element == ref; });
    return found == model.closed_switches.end() ? std::nullopt : coupler_change(model, solved, *found);
  }
  if (terminals.empty()) return std::nullopt;
  OutageChange change;
  change.element = ref;
  Builder builder(model, solved, change);
  for (const auto t : terminals) {
    const auto place = builder.place(model.terminals[t].node);
    if (std::find(change.own.begin(), change.own.end(), place) == change.own.end())
      change.own.push_back(place);
  }
  const auto& slots = solved.slots(terminals.front());
  builder.remove_block(model.blocks[slots[0].block]);
  if (slots[1].used)
    builder.remove_from_group(model.blocks[slots[1].block], slots[1].position,
                              earthed || network.lines[ref.index].earthed_when_out.value_or(false));
  if (!builder.finish()) throw std::logic_error("an element's admittance has no diagonal entry");
  return change;
}

TerminalTable::TerminalTable(const SequenceModel& model) {
  std::vector<std::uint32_t> order;
  for (std::uint32_t t = 0; t < model.terminals.size(); ++t) order.push_back(t);
  std::sort(order.begin(), order.end(), [&](auto a, auto b) {
    return std::pair(model.terminals[a].element, a) < std::pair(model.terminals[b].element, b);
  });
  for (const auto t : order) {
    if (elements_.empty() || elements_.back() != model.terminals[t].element) {
      elements_.push_back(model.terminals[t].element);
      start_.push_back(static_cast<std::uint32_t>(terminals_.size()));
    }
    terminals_.push_back(t);
  }
  start_.push_back(static_cast<std::uint32_t>(terminals_.size()));
}

std::span<const std::uint32_t> TerminalTable::of(ElementRef element) const {
  const auto found = std::lower_bound(elements_.begin(), elements_.end(), element);
  if (found == elements_.end() || *found != element) return {};
  const auto k = static_cast<std::size_t>(found - elements_.begin());
  return {terminals_.data() + start_[k], terminals_.data() + start_[k + 1]};
}

LostParts::LostParts(const SequenceModel& model, const FaultNetwork& solved)
    : model_(&model), solved_(&solved), seen_(2 * model.node_count(), 0) {}

bool LostParts::supplies(std::uint32_t terminal, int sequence) const {
  const ElementKind kind = model_->terminals[terminal].element.kind;
  if (sequence != kZero)
    return kind == ElementKind::network_feeder || kind == ElementKind::synchronous_machine ||
           kind == ElementKind::induction_motor;
  const auto& own = solved_->slots(terminal)[0];
  const Block& block = model_->blocks[own.block];
  return block.earthed[kZero] &&
         model_->block_y[block.first_y + own.position * block.count + own.position][kZero] != Complex(0);
}

// True when the place is supplied without the element; otherwise `found` holds all it hangs together with.
bool LostParts::explore(Place start, const OutageChange& outage, int sequence, std::vector<Place>& found) {
  const SequenceModel& m = *model_;
  const auto far = [&](std::uint32_t t) {
    const Terminal& terminal = m.terminals[t];
    return outage.split && terminal.node == outage.split->node &&
           std::binary_search(outage.split->far_buses.begin(), outage.split->far_buses.end(), terminal.bus);
  };
  const auto mark = [&](Place p) {
    return std::exchange(seen_[2 * at(p.first) + (p.second ? 1 : 0)], stamp_) != stamp_;
  };
  ++stamp_;
  found.assign(1, start);
  mark(start);
  for (std::size_t k = 0; k < found.size(); ++k) {
    const Place here = found[k];
    for (std::uint32_t t = m.terminal_start[at(here.first)]; t < m.terminal_start[at(here.first) + 1]; ++t) {
      if (m.terminals[t].element == outage.element || far(t) != here.second) continue;
      if (supplies(t, sequence)) return true;
      for (const auto& slot : solved_->slots(t)) {
        if (!slot.used) continue;
        const Block& block = m.blocks[slot.block];
        for (std::uint32_t q = 0; q < block.count; ++q) {
          const std::uint32_t other = m.block_terminals[block.first + q];
          if (block.coupling && m.terminals[other].element != m.terminals[t].element) continue;
          if (m.block_y[block.first_y + slot.position * block.count + q][sequence] == Complex(0)) continue;
          const Place there{m.terminals[other].node, far(other)};
          if (mark(there)) found.push_back(there);
        }
      }
    }
  }
  return false;
}

LostParts::Lost LostParts::find(const OutageChange& outage, int sequence) {
  Lost lost;
  std::vector<Place> starts, found;
  for (const auto place : outage.own) {
    starts.emplace_back(outage.nodes[place], false);
    if (outage.split && outage.nodes[place] == outage.split->node)
      starts.emplace_back(outage.nodes[place], true);
  }
  for (const Place& start : starts) {
    const bool known = (outage.split && start.first == outage.split->node)
                           ? (start.second ? lost.far : lost.near)
                           : std::find(lost.nodes.begin(), lost.nodes.end(), start.first) != lost.nodes.end();
    if (known || explore(start, outage, sequence, found)) continue;
    lost.islands.push_back(start.first);
    for (const auto& [node, far] : found) {
      if (outage.split && node == outage.split->node)
        (far ? lost.far : lost.near) = true;
      else
        lost.nodes.push_back(node);
    }
  }
  return lost;
}

}  // namespace kiloamp::detail
