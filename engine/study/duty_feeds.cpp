#include "engine/study/duty_feeds.hpp"

#include <algorithm>
#include <map>

#include "engine/fault/fault_network.hpp"

namespace kiloamp::detail {

namespace {

constexpr double kNoPart = 1e-9;  // of the whole

bool is_source(ElementKind kind) {
  return kind == ElementKind::network_feeder || kind == ElementKind::synchronous_machine ||
         kind == ElementKind::induction_motor || kind == ElementKind::inverter_source;
}

// Terminals at the bus's node whose current flows through the branch's end at the bus; empty when a loop of
// switches leaves that open.
std::vector<std::uint32_t> own_terminals(const SequenceModel& m, BusIndex bus, ElementRef branch) {
  const Node node = m.node_of_bus[at(bus)];
  std::vector<std::uint32_t> own;
  const auto first = m.terminal_start[at(node)], last = m.terminal_start[at(node) + 1];
  if (branch.kind != ElementKind::bus_switch) {
    for (auto t = first; t < last; ++t)
      if (m.terminals[t].element == branch && m.terminals[t].bus == bus) own.push_back(t);
    return own;
  }
  std::vector<BusIndex> far;
  for (const MergedSwitch& s : m.closed_switches)
    if (s.element == branch) far.push_back(s.from == bus ? s.to : s.from);
  for (std::size_t i = 0; i < far.size(); ++i)
    for (const MergedSwitch& s : m.closed_switches) {
      if (s.element == branch || (s.from != far[i] && s.to != far[i])) continue;
      const BusIndex next = s.from == far[i] ? s.to : s.from;
      if (next == bus) return {};
      if (std::find(far.begin(), far.end(), next) == far.end()) far.push_back(next);
    }
  for (auto t = first; t < last; ++t)
    if (std::find(far.begin(), far.end(), m.terminals[t].bus) != far.end()) own.push_back(t);
  return own;
}

// Entries of some columns of Z, positive sequence, at some rows.
class Columns {
 public:
  Columns(const FaultNetwork& solved, std::vector<Node> columns, const std::vector<sparse::Index>& rows)
      : columns_(std::move(columns)) {
    auto solver = solved.factors().sparse_solver();
    constexpr std::size_t kBlock = decltype(solver)::kBlock;
    std::vector<sparse::Index> wanted = rows;
    for (const Node node : columns_) wanted.push_back(static_cast<sparse::Index>(node));
    z_.resize(columns_.size());
    for (std::size_t first = 0; first < columns_.size(); first += kBlock) {
      const std::size_t count = std::min(kBlock, columns_.size() - first);
      solver.clear();
      for (std::size_t c = 0; c < count; ++c)
        solver.put(static_cast<int>(c), static_cast<sparse::Index>(columns_[first + c]), {0, 1, 0});
      solver.solve_at(wanted);
      for (std::size_t c = 0; c < count; ++c)
        for (const sparse::Index row : wanted)
          z_[first + c][row] = solver.get(static_cast<int>(c), row)[kPositive];
    }
  }
  [[nodiscard]] Complex at(Node column, Node row) const {
    const auto c = std::find(columns_.begin(), columns_.end(), column) - columns_.begin();
    return z_[static_cast<std::size_t>(c)].at(static_cast<sparse::Index>(row));
  }

 private:
  std::vector<Node> columns_;
  std::vector<std::map<sparse::Index, Complex>> z_;
};

}  // namespace

std::vector<DutyFeed> duty_feeds(const Study& study, BusIndex bus, const std::optional<ElementRef>& branch,
                                 DutySide side, double through_ka, std::size_t most) {
  const SequenceModel& m = study.model();
  const FaultNetwork& solved = study.solver().solved();
  const Node k = m.node_of_bus[at(bus)];
  std::vector<std::uint32_t> own;
  if (side != DutySide::total) {
    own = own_terminals(m, bus, *branch);
    if (own.empty()) return {};
  }
  struct Source {
    std::uint32_t terminal;
    Complex y;
  };
  std::vector<Source> sources;
  std::vector<sparse::Index> rows;
  for (const Block& b : m.blocks) {
    const auto t = m.block_terminals[b.first];
    if (!is_source(m.terminals[t].element.kind)) continue;
    sources.push_back({t, m.block_y[b.first_y][kPositive]});
    rows.push_back(static_cast<sparse::Index>(m.terminals[t].node));
  }
  std::vector<Node> columns{k};
  const auto block_of = [&](std::uint32_t t) -> const Block& { return m.blocks[solved.slots(t)[0].block]; };
  for (const auto t : own) {
    const Block& b = block_of(t);
    for (std::uint32_t q = 0; q < b.count; ++q) {
      const Node node = m.terminals[m.block_terminals[b.first + q]].node;
      if (std::find(columns.begin(), columns.end(), node) == columns.end()) columns.push_back(node);
    }
  }
  const Columns z(solved, columns, rows);
  const Complex z_kk = z.at(k, k);
  std::vector<Complex> parts;
  Complex sum = 0;
  for (const Source& s : sources) {
    const Node j = m.terminals[s.terminal].node;
    const Complex z_jk = z.at(k, j);
    Complex own_part = 0;
    for (const auto t : own) {
      if (t == s.terminal) own_part += s.y * z_kk;
      const Block& b = block_of(t);
      const std::uint32_t p = solved.slots(t)[0].position;
      for (std::uint32_t q = 0; q < b.count; ++q) {
        const Node node = m.terminals[m.block_terminals[b.first + q]].node;
        const Complex v = node == k ? Complex(0) : z.at(node, j) - z.at(node, k) * z_jk / z_kk;
        own_part -= m.block_y[b.first_y + p * b.count + q][kPositive] * v * s.y * z_kk;
      }
    }
    const Complex total_part = s.y * z_jk;
    parts.push_back(side == DutySide::total ? total_part
                    : side == DutySide::own ? own_part
                                            : total_part - own_part);
    sum += parts.back();
  }
  std::vector<DutyFeed> feeds;
  if (std::abs(sum) < kNoPart) return feeds;
  for (std::size_t i = 0; i < sources.size(); ++i) {
    const double share = (parts[i] / sum).real();
    if (share > kNoPart)
      feeds.push_back({m.terminals[sources[i].terminal].element, share * through_ka, share});
  }
  std::stable_sort(feeds.begin(), feeds.end(),
                   [](const auto& a, const auto& b) { return a.share > b.share; });
  if (feeds.size() > most) feeds.resize(most);
  return feeds;
}

}  // namespace kiloamp::detail
