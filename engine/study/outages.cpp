#include "engine/study/outages.hpp"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>

#include "engine/sparse/run_tasks.hpp"
#include "engine/study/outage_worker.hpp"

namespace kiloamp {

namespace {

using detail::LostParts;
using detail::OutageBatch;
using detail::OutageChange;
using detail::OutagePlace;
using detail::OutagePlaces;

// An outage that moves a current by less is not named.
constexpr double kNoEffect = 1e-9;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

// kA of a loop of |Z|^2 in pu: 3-phase e/|Z|, line to ground 3 e/|Z|.
double current_ka(const Study& study, std::size_t bus, double loop, FaultKind kind) {
  const SequenceModel& m = study.model();
  const Node node = m.node_of_bus[bus];
  if (node == Node::none || !m.has_source[at(node)]) return 0;
  if (kind == FaultKind::line_to_ground && !m.has_zero_path[at(node)]) return 0;
  const double e =
      study.solver().prefault_pu(static_cast<BusIndex>(bus)) * m.base_ka(static_cast<BusIndex>(bus));
  return (kind == FaultKind::line_to_ground ? 3 : 1) * e / std::sqrt(loop);
}

std::vector<OutageChange> all_changes(const Study& study, const std::vector<ElementKind>& wanted) {
  static const std::vector<ElementKind> usual{
      ElementKind::network_feeder, ElementKind::synchronous_machine,       ElementKind::line,
      ElementKind::transformer,    ElementKind::three_winding_transformer, ElementKind::series_reactor,
      ElementKind::bus_switch};
  const auto& kinds = wanted.empty() ? usual : wanted;
  const detail::TerminalTable terminals(study.model());
  std::vector<OutageChange> changes;
  for_each_section(study.network(), [&](ElementKind kind, const auto& section) {
    if (std::find(kinds.begin(), kinds.end(), kind) == kinds.end()) return;
    for (std::uint32_t i = 0; i < section.size(); ++i)
      if (auto change = detail::outage_change(study.network(), study.model(), study.solver().solved(),
                                              {kind, i}, terminals.of({kind, i})))
        changes.push_back(std::move(*change));
  });
  return changes;
}

// Places within `depth` branches of the outage's own nodes.
class Near {
 public:
  Near(const Study& study, const OutagePlaces& places)
      : model_(study.model()),
        solved_(study.solver().solved()),
        places_(places),
        seen_(model_.node_count(), 0) {}
  std::vector<std::uint32_t> of(const OutageChange& o, int depth) {
    ++stamp_;
    std::vector<Node> reached;
    const auto visit = [&](Node n) {
      if (std::exchange(seen_[at(n)], stamp_) != stamp_) reached.push_back(n);
    };
    for (const auto place : o.own) visit(o.nodes[place]);
    std::size_t first = 0;
    for (int step = 0; step < depth; ++step)
      for (const std::size_t last = reached.size(); first < last; ++first)
        for (std::uint32_t t = model_.terminal_start[at(reached[first])];
             t < model_.terminal_start[at(reached[first]) + 1]; ++t) {
          const Block& block = model_.blocks[solved_.slots(t)[0].block];
          for (std::uint32_t q = 0; q < block.count; ++q)
            visit(model_.terminals[model_.block_terminals[block.first + q]].node);
        }
    std::vector<std::uint32_t> near;
    for (const Node n : reached)
      for (const BusIndex b : model_.buses_of(n))
        if (places_.of_bus[at(b)] != OutagePlaces::kNone) near.push_back(places_.of_bus[at(b)]);
    return near;
  }

 private:
  const SequenceModel& model_;
  const detail::FaultNetwork& solved_;
  const OutagePlaces& places_;
  std::vector<std::uint32_t> seen_;
  std::uint32_t stamp_ = 0;
};

// The extremes of one thread: smallest and largest loop per place and kind, with the first outage that
// reaches it.
class Extremes {
 public:
  struct One {
    double loop;
    std::size_t outage;
  };
  struct Pair {
    One smallest{kInfinite, SIZE_MAX}, largest{-1, SIZE_MAX};
    void take(const One& one) {
      if (one.loop < smallest.loop || (one.loop == smallest.loop && one.outage < smallest.outage))
        smallest = one;
      if (one.loop > largest.loop || (one.loop == largest.loop && one.outage < largest.outage)) largest = one;
    }
  };
  struct Place {
    Pair three_phase, line_to_ground;
  };

  explicit Extremes(std::size_t places) : places_(places) {}
  /// All outages of a batch at one place; outages[k] is number k's.
  void take_all(std::size_t place, const OutageBatch& batch, const std::array<std::size_t, 4>& outages) {
    Place& here = places_[place];
    const auto check = [&](const sparse::FourDoubles& loops, Pair& pair) {
      const auto [least, most] = std::minmax({loops[0], loops[1], loops[2], loops[3]});
      if (least > pair.smallest.loop && most < pair.largest.loop) return;  // by far the most common
      for (int k = 0; k < static_cast<int>(batch.which.size()); ++k)
        pair.take({loops[k], outages[static_cast<std::size_t>(k)]});
    };
    check(batch.three_phase[place], here.three_phase);
    check(batch.line_to_ground[place], here.line_to_ground);
  }
  /// Number `k` of a batch, at one place.
  void take(std::size_t place, const OutageBatch& batch, int k, std::size_t outage) {
    places_[place].three_phase.take({batch.three_phase[place][k], outage});
    places_[place].line_to_ground.take({batch.line_to_ground[place][k], outage});
  }
  void merge(const Extremes& other) {
    for (std::size_t p = 0; p < places_.size(); ++p) {
      const Place& theirs = other.places_[p];
      for (const One& one : {theirs.three_phase.smallest, theirs.three_phase.largest})
        if (one.outage != SIZE_MAX) places_[p].three_phase.take(one);
      for (const One& one : {theirs.line_to_ground.smallest, theirs.line_to_ground.largest})
        if (one.outage != SIZE_MAX) places_[p].line_to_ground.take(one);
    }
  }
  [[nodiscard]] const Place& operator[](std::size_t place) const { return places_[place]; }

 private:
  std::vector<Place> places_;
};

OutageSplit split_note(const Study& study, const OutageChange& o, const BySequence<LostParts::Lost>& lost) {
  OutageSplit note{o.element, {}, {}};
  const SequenceModel& m = study.model();
  const auto list = [&](int s, std::vector<BusIndex>& buses) {
    for (const Node node : lost[s].nodes)
      for (const BusIndex b : m.buses_of(node)) buses.push_back(b);
    if (o.split)
      for (const BusIndex b : m.buses_of(o.split->node)) {
        const bool far = std::binary_search(o.split->far_buses.begin(), o.split->far_buses.end(), b);
        if (far ? lost[s].far : lost[s].near) buses.push_back(b);
      }
    // What had none before lost nothing.
    std::erase_if(buses, [&](BusIndex b) {
      return s == kZero ? !m.has_zero_path[at(m.node_of_bus[at(b)])]
                        : !m.has_source[at(m.node_of_bus[at(b)])];
    });
    std::sort(buses.begin(), buses.end());
  };
  list(kPositive, note.without_source);
  list(kZero, note.without_earth_path);
  return note;
}

OutageExtreme extreme(const Study& study, std::size_t bus, FaultKind kind, double intact_ka,
                      const Extremes::One& one, const std::vector<OutageChange>& changes) {
  if (one.outage == SIZE_MAX) return {intact_ka, std::nullopt};
  const double ka = current_ka(study, bus, one.loop, kind);
  if (std::abs(ka - intact_ka) <= kNoEffect * intact_ka) return {intact_ka, std::nullopt};
  return {ka, changes[one.outage].element};
}

}  // namespace

std::optional<OutageCurrents> one_outage(const Study& study, ElementRef element) {
  const detail::TerminalTable terminals(study.model());
  const auto change = detail::outage_change(study.network(), study.model(), study.solver().solved(), element,
                                            terminals.of(element));
  if (!change) return std::nullopt;
  OutageCurrents currents;
  const detail::OutagePlaces places(study);
  currents.three_phase_ka.assign(places.of_bus.size(), 0);
  currents.line_to_ground_ka.assign(places.of_bus.size(), 0);
  detail::OutageWorker worker(study, places);
  worker.run(std::span(&*change, 1), [&](const OutageBatch& batch) {
    for (std::size_t p = 0; p < places.row.size(); ++p) {
      const std::size_t bus = at(places.row[p].bus);
      currents.three_phase_ka[bus] = current_ka(study, bus, batch.three_phase[p][0], FaultKind::three_phase);
      currents.line_to_ground_ka[bus] =
          current_ka(study, bus, batch.line_to_ground[p][0], FaultKind::line_to_ground);
    }
  });
  return currents;
}

namespace {

// A bus inside a power station unit has factors of its own, before every outage and after it.
void replace_rows_inside_units(const Study& study, const OutageOptions& options, OutageTable& table) {
  for (std::size_t r = 0; r < table.rows.size(); ++r) {
    const BusIndex bus = table.rows[r].bus;
    const auto inside = study.inside_unit(bus);
    if (!inside || (r > 0 && table.rows[r - 1].bus == bus)) continue;
    OutageOptions same = options;
    same.progress = {};
    const OutageTable own = single_outages(*inside, same);
    for (const OutageRow& row : own.rows)
      for (OutageRow& place : table.rows)
        if (place.bus == row.bus && place.kind == row.kind) place = row;
  }
}

}  // namespace

OutageTable single_outages(const Study& study, const OutageOptions& options) {
  const OutagePlaces places(study);
  const std::vector<OutageChange> changes = all_changes(study, options.kinds);
  const auto in_zone = [&](BusIndex bus) {
    return !options.zone || study.network().bus(bus).zone == options.zone;
  };
  std::vector<std::uint32_t> wanted;  // places
  for (std::uint32_t p = 0; p < places.row.size(); ++p)
    if (in_zone(places.row[p].bus)) wanted.push_back(p);

  struct Thread {
    detail::OutageWorker worker;
    Near near;
    Extremes extremes;
    std::vector<OutageSplit> splits;
  };
  constexpr std::size_t kInTask = 64;
  std::vector<std::optional<Thread>> threads(static_cast<std::size_t>(std::max(1, options.threads)));
  std::atomic<std::size_t> done{0};
  const auto tasks = static_cast<int>((changes.size() + kInTask - 1) / kInTask);
  sparse::run_tasks(tasks, options.threads, [&](int task, int thread) {
    auto& own = threads[static_cast<std::size_t>(thread)];
    if (!own)
      own.emplace(
          Thread{detail::OutageWorker(study, places), Near(study, places), Extremes(places.row.size()), {}});
    const std::size_t first = static_cast<std::size_t>(task) * kInTask;
    const std::size_t count = std::min(kInTask, changes.size() - first);
    own->worker.run(std::span(changes).subspan(first, count), [&](const OutageBatch& batch) {
      if (!options.depth) {
        std::array<std::size_t, 4> outages{};
        for (std::size_t k = 0; k < batch.which.size(); ++k) outages[k] = first + batch.which[k];
        for (const auto p : wanted) own->extremes.take_all(p, batch, outages);
      }
      for (std::size_t k = 0; k < batch.which.size(); ++k) {
        const OutageChange& change = changes[first + batch.which[k]];
        if (options.depth)
          for (const auto p : own->near.of(change, *options.depth))
            if (in_zone(places.row[p].bus))
              own->extremes.take(p, batch, static_cast<int>(k), first + batch.which[k]);
        const auto& lost = *batch.lost[k];
        if (!lost[kPositive].any() && !lost[kZero].any()) continue;
        OutageSplit note = split_note(study, change, lost);
        if (!note.without_source.empty() || !note.without_earth_path.empty())
          own->splits.push_back(std::move(note));
      }
    });
    done += count;
    if (thread == 0 && options.progress) options.progress(done, changes.size());
  });

  OutageTable table;
  table.outages = changes.size();
  Extremes total(places.row.size());
  for (auto& thread : threads) {
    if (!thread) continue;
    total.merge(thread->extremes);
    for (OutageSplit& split : thread->splits) table.splits.push_back(std::move(split));
  }
  std::sort(table.splits.begin(), table.splits.end(),
            [](const auto& a, const auto& b) { return a.outage < b.outage; });
  for (std::size_t b = 0; b < places.of_bus.size(); ++b) {
    const auto bus = static_cast<BusIndex>(b);
    const auto p = places.of_bus[b];
    if (p == OutagePlaces::kNone || !in_zone(bus)) continue;
    const OutagePlace& place = places.row[p];
    const auto z = study.solver().thevenin_pu(bus);
    for (const FaultKind kind : {FaultKind::three_phase, FaultKind::line_to_ground}) {
      const bool three = kind == FaultKind::three_phase;
      OutageRow row{bus, kind, 0, {}, {}};
      if (z && (three || z->z0))
        row.intact_ka = current_ka(
            study, b, std::norm(three ? z->z1 + place.extra3 : z->z1 + z->z2 + *z->z0 + place.extra1), kind);
      const Extremes::Pair& pair = three ? total[p].three_phase : total[p].line_to_ground;
      row.largest = extreme(study, b, kind, row.intact_ka, pair.smallest, changes);
      row.smallest = extreme(study, b, kind, row.intact_ka, pair.largest, changes);
      if (row.largest.current_ka < row.intact_ka) row.largest = {row.intact_ka, std::nullopt};
      if (row.smallest.current_ka > row.intact_ka) row.smallest = {row.intact_ka, std::nullopt};
      table.rows.push_back(row);
    }
  }
  replace_rows_inside_units(study, options, table);
  return table;
}

}  // namespace kiloamp
