#include "engine/study/duty_feeds.hpp"

#include <algorithm>

namespace kiloamp::detail {

namespace {

constexpr double kNoPart = 1e-9;  // of the whole

bool is_source(ElementKind kind) {
  return kind == ElementKind::network_feeder || kind == ElementKind::synchronous_machine ||
         kind == ElementKind::induction_motor || kind == ElementKind::inverter_source;
}

// Terminals at the bus's node whose current flows through the branch's end at the bus.
std::vector<std::uint32_t> own_terminals(const SequenceModel& m, BusIndex bus, ElementRef branch) {
  const Node node = m.node_of_bus[at(bus)];
  const bool is_switch = branch.kind == ElementKind::bus_switch;
  const auto far = is_switch ? far_side(m, bus, branch) : std::vector<BusIndex>{};
  std::vector<std::uint32_t> own;
  for (auto t = m.terminal_start[at(node)]; t < m.terminal_start[at(node) + 1]; ++t) {
    const Terminal& terminal = m.terminals[t];
    if (is_switch ? std::find(far.begin(), far.end(), terminal.bus) != far.end()
                  : terminal.element == branch && terminal.bus == bus)
      own.push_back(t);
  }
  return own;
}

}  // namespace

std::vector<BusIndex> far_side(const SequenceModel& m, BusIndex bus, ElementRef opened) {
  std::vector<BusIndex> far;
  for (const MergedSwitch& s : m.closed_switches)
    if (s.element == opened) far.push_back(s.from == bus ? s.to : s.from);
  for (std::size_t i = 0; i < far.size(); ++i)
    for (const MergedSwitch& s : m.closed_switches) {
      if (s.element == opened || (s.from != far[i] && s.to != far[i])) continue;
      const BusIndex next = s.from == far[i] ? s.to : s.from;
      if (next == bus) return {};
      if (std::find(far.begin(), far.end(), next) == far.end()) far.push_back(next);
    }
  return far;
}

FeedFinder::FeedFinder(const FaultSolver& solver)
    : model_(solver.model()), solved_(solver.solved()), solver_(solved_.factors().sparse_solver()) {
  for (const Block& b : model_.blocks) {
    const auto t = model_.block_terminals[b.first];
    if (!is_source(model_.terminals[t].element.kind)) continue;
    sources_.push_back({t, model_.block_y[b.first_y][kPositive]});
    rows_.push_back(static_cast<sparse::Index>(model_.terminals[t].node));
  }
}

void FeedFinder::solve_columns(const std::vector<Node>& nodes) {
  std::vector<sparse::Index> wanted = rows_;
  for (const Node node : nodes) wanted.push_back(static_cast<sparse::Index>(node));
  columns_.assign(nodes.size(), Column(wanted.size()));
  constexpr std::size_t kBlock = Solver::kBlock;
  for (std::size_t first = 0; first < nodes.size(); first += kBlock) {
    const std::size_t count = std::min(kBlock, nodes.size() - first);
    solver_.clear();
    for (std::size_t c = 0; c < count; ++c)
      solver_.put(static_cast<int>(c), static_cast<sparse::Index>(nodes[first + c]), {0, 1, 0});
    solver_.solve_at(wanted);
    for (std::size_t c = 0; c < count; ++c)
      for (std::size_t w = 0; w < wanted.size(); ++w)
        columns_[first + c][w] = solver_.get(static_cast<int>(c), wanted[w])[kPositive];
  }
}

std::vector<DutyFeed> FeedFinder::split(BusIndex bus, const std::optional<ElementRef>& branch, DutySide side,
                                        double through_ka, std::size_t most) {
  const SequenceModel& m = model_;
  const Node k = m.node_of_bus[at(bus)];
  std::vector<std::uint32_t> own;
  if (side != DutySide::total) own = own_terminals(m, bus, *branch);
  // Own branch's other ends: their node's column, and y into the terminal at k.
  struct End {
    std::size_t column;
    Complex y;
  };
  std::vector<Node> nodes{k};
  std::vector<End> ends;
  for (const auto t : own) {
    const auto& slot = solved_.slots(t)[0];
    const Block& b = m.blocks[slot.block];
    for (std::uint32_t q = 0; q < b.count; ++q) {
      const Node node = m.terminals[m.block_terminals[b.first + q]].node;
      if (node == k) continue;  // at no voltage
      auto place = std::find(nodes.begin(), nodes.end(), node);
      if (place == nodes.end()) place = nodes.insert(nodes.end(), node);
      ends.push_back({static_cast<std::size_t>(place - nodes.begin()),
                      m.block_y[b.first_y + slot.position * b.count + q][kPositive]});
    }
  }
  solve_columns(nodes);
  const Column& of_k = columns_.front();
  const Complex z_kk = of_k[sources_.size()];
  std::vector<Complex> parts(sources_.size());
  Complex sum = 0;
  for (std::size_t j = 0; j < sources_.size(); ++j) {
    const Complex z_jk = of_k[j];
    const Complex total_part = sources_[j].y * z_jk;
    Complex own_part = 0;
    for (const auto t : own)
      if (t == sources_[j].terminal) own_part += sources_[j].y * z_kk;
    for (const End& end : ends) {
      const Complex v = columns_[end.column][j] - of_k[sources_.size() + end.column] * z_jk / z_kk;
      own_part -= end.y * v * sources_[j].y * z_kk;
    }
    parts[j] = side == DutySide::total ? total_part
               : side == DutySide::own ? own_part
                                       : total_part - own_part;
    sum += parts[j];
  }
  std::vector<DutyFeed> feeds;
  if (std::abs(sum) < kNoPart) return feeds;
  for (std::size_t j = 0; j < sources_.size(); ++j) {
    const double share = (parts[j] / sum).real();
    if (share > kNoPart)
      feeds.push_back({m.terminals[sources_[j].terminal].element, share * through_ka, share});
  }
  std::stable_sort(feeds.begin(), feeds.end(),
                   [](const auto& a, const auto& b) { return a.share > b.share; });
  if (feeds.size() > most) feeds.resize(most);
  return feeds;
}

}  // namespace kiloamp::detail
