#include "engine/study/outages.hpp"

#include <Eigen/LU>
#include <Eigen/SVD>
#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>
#include <mutex>
#include <thread>

#include "engine/study/outage_change.hpp"

namespace kiloamp {

namespace {

using detail::LostParts;
using detail::OutageChange;
using Solver = sparse::Factorisation<Complex, 3>::SparseSolver;
using Entry = sparse::Factorisation<Complex, 3>::Entry;

// Below this the small matrix may be singular: the graph is asked whether the outage cuts something off. What
// is cut off without a source may still have an impedance of its own and then the matrix is only small; below
// kSingular it is round-off.
constexpr double kSuspectSplit = 1e-6;
constexpr double kSingular = 1e-12;
// A difference above this part of its terms has kept its digits.
constexpr double kWellConditioned = 1e-3;
// An outage that moves a current by less is not named.
constexpr double kNoEffect = 1e-9;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

// |Z|^2 of the loop of each fault at every bus; infinite where there is no current.
struct Loops {
  std::vector<double> three_phase, line_to_ground;
};

struct Places {  // fixed for the study
  std::vector<std::int32_t> node_of_bus;
  std::vector<Complex> extra3, extra1;  // fault impedances in pu
};

// One thread's work on outages, one or several at a time.
class Worker {
 public:
  explicit Worker(const Study& study)
      : study_(study),
        model_(study.model()),
        solved_(study.solver().solved()),
        solver_(solved_.factors().sparse_solver()),
        lost_(model_, solved_) {}

  // Columns of as many outages as fit into one block are solved together; visit(k, loops, losts) for each.
  template <typename Visit>
  void run(std::span<const OutageChange> outages, const Places& places, Visit&& visit) {
    std::size_t first = 0;
    while (first < outages.size()) {
      std::size_t last = first;
      int columns = 0;
      while (last < outages.size() && (last == first || columns + outages[last].columns() <= Solver::kBlock))
        columns += outages[last++].columns();
      solve(outages.subspan(first, last - first));
      int column = 0;
      for (std::size_t k = first; k < last; ++k) {
        apply(outages[k], column, places);
        visit(k, loops_, lost_now_);
        column += outages[k].columns();
      }
      first = last;
    }
  }

 private:
  void solve(std::span<const OutageChange> outages) {
    const std::size_t n = model_.node_count();
    int column = 0, in_block = 0;
    std::size_t total = 0;
    for (const auto& o : outages) total += static_cast<std::size_t>(o.columns());
    w_.resize(std::max(w_.size(), total));
    const auto flush = [&] {
      if (in_block == 0) return;
      solver_.solve();
      for (int b = 0; b < in_block; ++b) {
        auto& w = w_[static_cast<std::size_t>(column - in_block + b)];
        w.resize(n);
        solver_.copy(b, w);
      }
      in_block = 0;
    };
    for (const OutageChange& o : outages)
      for (int r = 0; r < o.columns(); ++r) {
        if (in_block == 0) solver_.clear();
        for (std::size_t place = 0; place < o.nodes.size(); ++place) {
          Entry value{};
          for (int s = 0; s < 3; ++s)
            if (r < o.rank[s]) value[s] = o.u[s][static_cast<std::size_t>(r)][place];
          solver_.put(in_block, static_cast<sparse::Index>(o.nodes[place]), value);
        }
        ++in_block;
        ++column;
        if (in_block == Solver::kBlock) flush();
      }
    flush();
  }

  // D^-1 - u^T W of a strong element is a small difference of large numbers. Kirchhoff's law at a terminal
  // node p says the same without it: what u_p injects and the element does not carry away, the rest does,
  // rest_p = u_p d (D^-1 - u^T W). The better conditioned of the two is taken, by the size of the terms.
  Complex sharper(const OutageChange& o, int s, int column, Complex plain, double plain_terms) const {
    Complex best = plain;
    double best_terms = plain_terms;
    if (std::abs(plain) > kWellConditioned * plain_terms) return best;
    const auto& w = w_[static_cast<std::size_t>(column)];
    for (const auto place : o.own) {
      const Complex scale = o.u[s][0][place] * o.d[s][0];
      if (scale == Complex(0)) continue;
      const Node node = o.nodes[place];
      Complex rest = 0;
      double terms = 0;
      for (std::uint32_t t = model_.terminal_start[at(node)]; t < model_.terminal_start[at(node) + 1]; ++t) {
        if (model_.terminals[t].element == o.element) continue;
        for (const auto& slot : solved_.slots(t)) {
          if (!slot.used) continue;
          const Block& block = model_.blocks[slot.block];
          if (block.coupling && s != kZero) continue;
          for (std::uint32_t q = 0; q < block.count; ++q) {
            const std::uint32_t other = model_.block_terminals[block.first + q];
            if (model_.terminals[other].element == o.element)
              return best;  // coupled with it: the rest is not apart
            const Complex term = model_.block_y[block.first_y + slot.position * block.count + q][s] *
                                 w[at(model_.terminals[other].node)][s];
            rest += term;
            terms += std::abs(term);
          }
        }
      }
      terms /= std::abs(scale);
      if (terms < best_terms) {
        best = rest / scale;
        best_terms = terms;
      }
    }
    return best;
  }

  // (D^-1 - U^T W)^-1 of one sequence; returns the smallest singular value of its inverse against the terms
  // it is made of.
  double gain(const OutageChange& o, int s, int column, Eigen::MatrixXcd& g) const {
    const int r = o.rank[s];
    Eigen::MatrixXcd k(r, r);
    double smallest = kInfinite;
    for (int a = 0; a < r; ++a)
      for (int b = 0; b < r; ++b) {
        Complex sum = 0;
        for (std::size_t place = 0; place < o.nodes.size(); ++place)
          sum += o.u[s][static_cast<std::size_t>(a)][place] *
                 w_[static_cast<std::size_t>(column + b)][at(o.nodes[place])][s];
        k(a, b) = -sum;
      }
    for (int a = 0; a < r; ++a) {
      const Complex own = o.split ? o.d[s][0] : 1.0 / o.d[s][static_cast<std::size_t>(a)];
      k(a, a) += own;
      smallest = std::min(smallest, std::abs(own));
    }
    if (r == 0) {
      g.resize(0, 0);
      return 1;
    }
    if (r == 1 && !o.split) k(0, 0) = sharper(o, s, column, k(0, 0), smallest);
    const double least =
        r == 1 ? std::abs(k(0, 0)) : Eigen::JacobiSVD<Eigen::MatrixXcd>(k).singularValues()(r - 1);
    g = k.inverse();
    return least / smallest;
  }

  void apply(const OutageChange& o, int column, const Places& places) {
    lost_now_ = {};
    cut_ = {};
    // A part without a source may still have an impedance (shunts, transformers in parallel with unequal
    // ratios): the graph is always asked. In zero sequence every such path counts, so that a singular matrix
    // is what tells.
    lost_now_[kPositive] = lost_now_[kNegative] = lost_.find(o, kPositive);
    for (int s = 0; s < 3; ++s) {
      const double least = gain(o, s, column, g_[s]);
      if (least > kSuspectSplit) continue;
      if (s == kZero) lost_now_[s] = lost_.find(o, s);
      if (!lost_now_[s].any() || (o.rank[s] == 1 && least > kSingular)) continue;
      if (o.rank[s] == 1) {
        g_[s].setZero(1, 1);  // nothing flowed through it to what remains
        cut_[s] = true;
      } else {
        hold_lost_parts(o, s);
      }
    }
    update(o, column, places);
  }

  // More than one way through the element: the parts cut off are held by an admittance of their own, so that
  // the rest can be computed.
  void hold_lost_parts(const OutageChange& o, int s) {
    OutageChange held = o;
    double size = 0;
    for (const Complex d : o.d[s]) size = std::max(size, std::abs(d));
    for (const Node island : lost_now_[s].islands) {
      held.u[s].emplace_back(o.nodes.size(), 0);
      const auto place = std::find(o.nodes.begin(), o.nodes.end(), island) - o.nodes.begin();
      held.u[s].back()[static_cast<std::size_t>(place)] = 1;
      held.d[s].push_back(-size);
      ++held.rank[s];
    }
    const std::size_t n = model_.node_count();
    held_[s].assign(static_cast<std::size_t>(held.rank[s]), std::vector<Entry>(n));
    for (int r = 0; r < held.rank[s]; ++r) {
      solver_.clear();
      for (std::size_t place = 0; place < o.nodes.size(); ++place) {
        Entry value{};
        value[s] = held.u[s][static_cast<std::size_t>(r)][place];
        solver_.put(0, static_cast<sparse::Index>(o.nodes[place]), value);
      }
      solver_.solve();
      solver_.copy(0, held_[s][static_cast<std::size_t>(r)]);
    }
    Eigen::MatrixXcd k(held.rank[s], held.rank[s]);
    for (int a = 0; a < held.rank[s]; ++a)
      for (int b = 0; b < held.rank[s]; ++b) {
        Complex sum = 0;
        for (std::size_t place = 0; place < o.nodes.size(); ++place)
          sum += held.u[s][static_cast<std::size_t>(a)][place] *
                 held_[s][static_cast<std::size_t>(b)][at(o.nodes[place])][s];
        k(a, b) = (a == b ? 1.0 / held.d[s][static_cast<std::size_t>(a)] : Complex(0)) - sum;
      }
    g_[s] = k.inverse();
  }

  // Z'_nn of one sequence; `turned`: the far part of a split node, where 1 - w stands for w.
  Complex changed(const OutageChange& o, int s, int column, std::size_t n, bool turned) const {
    const Complex z = solved_.inverse().diagonal[n][s];
    const int rank = static_cast<int>(g_[s].rows());
    Complex change = 0;
    for (int a = 0; a < rank; ++a)
      for (int b = 0; b < rank; ++b) {
        const auto w = [&](int c) {
          const Complex value = rank == o.rank[s] ? w_[static_cast<std::size_t>(column + c)][n][s]
                                                  : held_[s][static_cast<std::size_t>(c)][n][s];
          return turned ? 1.0 - value : value;
        };
        change += g_[s](a, b) * w(a) * w(b);
      }
    return z + change;
  }

  void update(const OutageChange& o, int column, const Places& places) {
    const std::size_t buses = places.node_of_bus.size();
    loops_.three_phase.resize(buses);
    loops_.line_to_ground.resize(buses);
    const bool simple = g_[0].rows() <= 1 && g_[1].rows() <= 1 && g_[2].rows() <= 1 && o.columns() <= 1;
    if (simple && o.columns() == 1)
      rank_one(column, places);
    else
      for (std::size_t b = 0; b < buses; ++b)
        if (places.node_of_bus[b] >= 0) general(o, column, places, b, false);
    const auto drop = [&](std::size_t b, int s) {
      if (s != kZero) loops_.three_phase[b] = kInfinite;
      loops_.line_to_ground[b] = kInfinite;
    };
    if (o.split)
      for (const BusIndex bus : o.split->far_buses) general(o, column, places, at(bus), true);
    for (int s = 0; s < 2; ++s) {
      for (const Node node : lost_now_[s].nodes)
        for (const BusIndex bus : model_.buses_of(node)) drop(at(bus), s);
      if (!o.split) continue;
      for (const BusIndex bus : model_.buses_of(o.split->node)) {
        const bool far = std::binary_search(o.split->far_buses.begin(), o.split->far_buses.end(), bus);
        if (far ? lost_now_[s].far : lost_now_[s].near) drop(at(bus), s);
      }
    }
  }

  void general(const OutageChange& o, int column, const Places& places, std::size_t bus, bool far) {
    const auto n = static_cast<std::size_t>(places.node_of_bus[bus]);
    BySequence<Complex> z;
    for (int s = 0; s < 3; ++s) z[s] = changed(o, s, column, n, far && !cut_[s]);
    loops_.three_phase[bus] = std::norm(z[kPositive] + places.extra3[bus]);
    loops_.line_to_ground[bus] = std::norm(z[kPositive] + z[kNegative] + z[kZero] + places.extra1[bus]);
  }

  // The common case, written out: one column, three sequences, plain arithmetic that the compiler can lay
  // side by side.
  void rank_one(int column, const Places& places) {
    const auto& w = w_[static_cast<std::size_t>(column)];
    const auto& diagonal = solved_.inverse().diagonal;
    double gr[3], gi[3];
    for (int s = 0; s < 3; ++s) {
      gr[s] = g_[s].size() > 0 ? g_[s](0, 0).real() : 0;
      gi[s] = g_[s].size() > 0 ? g_[s](0, 0).imag() : 0;
    }
    for (std::size_t b = 0; b < places.node_of_bus.size(); ++b) {
      if (places.node_of_bus[b] < 0) continue;
      const auto n = static_cast<std::size_t>(places.node_of_bus[b]);
      double zr[3], zi[3];
      for (int s = 0; s < 3; ++s) {
        const double wr = w[n][s].real(), wi = w[n][s].imag(), qr = wr * wr - wi * wi, qi = 2 * wr * wi;
        zr[s] = diagonal[n][s].real() + gr[s] * qr - gi[s] * qi;
        zi[s] = diagonal[n][s].imag() + gr[s] * qi + gi[s] * qr;
      }
      const double r3 = zr[1] + places.extra3[b].real(), x3 = zi[1] + places.extra3[b].imag();
      const double r1 = zr[0] + zr[1] + zr[2] + places.extra1[b].real(),
                   x1 = zi[0] + zi[1] + zi[2] + places.extra1[b].imag();
      loops_.three_phase[b] = r3 * r3 + x3 * x3;
      loops_.line_to_ground[b] = r1 * r1 + x1 * x1;
    }
  }

  const Study& study_;
  const SequenceModel& model_;
  const detail::FaultNetwork& solved_;
  Solver solver_;
  LostParts lost_;
  std::vector<std::vector<Entry>> w_;
  BySequence<std::vector<std::vector<Entry>>> held_;
  BySequence<Eigen::MatrixXcd> g_;
  BySequence<LostParts::Lost> lost_now_;
  BySequence<bool> cut_{};  ///< of rank 1 and singular: the rest keeps its Z
  Loops loops_;
};

Places make_places(const Study& study) {
  const SequenceModel& m = study.model();
  Places p;
  for (std::size_t b = 0; b < m.node_of_bus.size(); ++b) {
    p.node_of_bus.push_back(static_cast<std::int32_t>(m.node_of_bus[b]));
    const double ohm = m.base_ohm(static_cast<BusIndex>(b));
    p.extra3.push_back(study.options().phase_ohm / ohm);
    p.extra1.push_back(3.0 * (study.options().phase_ohm + study.options().earth_ohm) / ohm);
  }
  return p;
}

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

// Buses within `depth` branches of the outage's own nodes.
class Near {
 public:
  Near(const Study& study)
      : model_(study.model()), solved_(study.solver().solved()), seen_(model_.node_count(), 0) {}
  std::vector<std::uint32_t> buses(const OutageChange& o, int depth) {
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
    std::vector<std::uint32_t> buses;
    for (const Node n : reached)
      for (const BusIndex b : model_.buses_of(n)) buses.push_back(static_cast<std::uint32_t>(at(b)));
    return buses;
  }

 private:
  const SequenceModel& model_;
  const detail::FaultNetwork& solved_;
  std::vector<std::uint32_t> seen_;
  std::uint32_t stamp_ = 0;
};

// The extremes of one thread: smallest and largest loop per bus and kind, with the first outage that reaches
// it.
struct Extremes {
  struct One {
    double loop;
    std::size_t outage;
  };
  std::array<std::vector<One>, 2> smallest, largest;
  explicit Extremes(std::size_t buses) {
    for (int k = 0; k < 2; ++k) {
      smallest[k].assign(buses, {kInfinite, SIZE_MAX});
      largest[k].assign(buses, {-1, SIZE_MAX});
    }
  }
  void take(std::size_t bus, int kind, double loop, std::size_t outage) {
    One &low = smallest[kind][bus], &high = largest[kind][bus];
    if (loop < low.loop) low = {loop, outage};
    if (loop > high.loop) high = {loop, outage};
  }
  void merge(const Extremes& other) {
    for (int k = 0; k < 2; ++k)
      for (std::size_t b = 0; b < smallest[k].size(); ++b) {
        const One &low = other.smallest[k][b], &high = other.largest[k][b];
        if (low.loop < smallest[k][b].loop ||
            (low.loop == smallest[k][b].loop && low.outage < smallest[k][b].outage))
          smallest[k][b] = low;
        if (high.loop > largest[k][b].loop ||
            (high.loop == largest[k][b].loop && high.outage < largest[k][b].outage))
          largest[k][b] = high;
      }
  }
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
  Worker worker(study);
  worker.run(std::span(&*change, 1), make_places(study), [&](std::size_t, const Loops& loops, const auto&) {
    for (std::size_t b = 0; b < loops.three_phase.size(); ++b) {
      currents.three_phase_ka.push_back(current_ka(study, b, loops.three_phase[b], FaultKind::three_phase));
      currents.line_to_ground_ka.push_back(
          current_ka(study, b, loops.line_to_ground[b], FaultKind::line_to_ground));
    }
  });
  return currents;
}

OutageTable single_outages(const Study& study, const OutageOptions& options) {
  const Places places = make_places(study);
  const std::vector<OutageChange> changes = all_changes(study, options.kinds);
  const std::size_t buses = places.node_of_bus.size();
  std::vector<std::uint32_t> all_buses;
  for (std::uint32_t b = 0; b < buses; ++b)
    if (places.node_of_bus[b] >= 0 && (!options.zone || study.network().buses[b].zone == options.zone))
      all_buses.push_back(b);

  Extremes total(buses);
  std::vector<OutageSplit> splits;
  std::mutex merging;
  std::atomic<std::size_t> next{0}, done{0};
  constexpr std::size_t kBatch = 64;
  std::exception_ptr failure;
  const auto work = [&](bool reports) {
    try {
      Worker worker(study);
      Near near(study);
      Extremes mine(buses);
      std::vector<OutageSplit> my_splits;
      for (std::size_t first = next.fetch_add(kBatch); first < changes.size();
           first = next.fetch_add(kBatch)) {
        const std::size_t count = std::min(kBatch, changes.size() - first);
        worker.run(std::span(changes).subspan(first, count), places,
                   [&](std::size_t k, const Loops& loops, const BySequence<LostParts::Lost>& lost) {
                     const std::size_t outage = first + k;
                     const auto take = [&](std::uint32_t b) {
                       mine.take(b, 0, loops.three_phase[b], outage);
                       mine.take(b, 1, loops.line_to_ground[b], outage);
                     };
                     if (!options.depth) {
                       for (const auto b : all_buses) take(b);
                     } else {
                       for (const auto b : near.buses(changes[outage], *options.depth))
                         if (!options.zone || study.network().buses[b].zone == options.zone) take(b);
                     }
                     if (lost[kPositive].any() || lost[kZero].any()) {
                       OutageSplit note = split_note(study, changes[outage], lost);
                       if (!note.without_source.empty() || !note.without_earth_path.empty())
                         my_splits.push_back(std::move(note));
                     }
                   });
        done += count;
        if (reports && options.progress) options.progress(done, changes.size());
      }
      const std::lock_guard lock(merging);
      total.merge(mine);
      splits.insert(splits.end(), std::make_move_iterator(my_splits.begin()),
                    std::make_move_iterator(my_splits.end()));
    } catch (...) {
      const std::lock_guard lock(merging);
      failure = std::current_exception();
    }
  };
  std::vector<std::thread> others;
  for (int t = 1; t < options.threads; ++t) others.emplace_back(work, false);
  work(true);
  for (auto& thread : others) thread.join();
  if (failure) std::rethrow_exception(failure);

  OutageTable table;
  table.outages = changes.size();
  table.splits = std::move(splits);
  std::sort(table.splits.begin(), table.splits.end(),
            [](const auto& a, const auto& b) { return a.outage < b.outage; });
  for (const auto b : all_buses) {
    const auto z = study.solver().thevenin_pu(static_cast<BusIndex>(b));
    for (const FaultKind kind : {FaultKind::three_phase, FaultKind::line_to_ground}) {
      const int k = kind == FaultKind::three_phase ? 0 : 1;
      OutageRow row{static_cast<BusIndex>(b), kind, 0, {}, {}};
      if (z && (k == 0 || z->z0))
        row.intact_ka = current_ka(
            study, b,
            std::norm(k == 0 ? z->z1 + places.extra3[b] : z->z1 + z->z2 + *z->z0 + places.extra1[b]), kind);
      row.largest = extreme(study, b, kind, row.intact_ka, total.smallest[k][b], changes);
      row.smallest = extreme(study, b, kind, row.intact_ka, total.largest[k][b], changes);
      if (row.largest.current_ka < row.intact_ka) row.largest = {row.intact_ka, std::nullopt};
      if (row.smallest.current_ka > row.intact_ka) row.smallest = {row.intact_ka, std::nullopt};
      table.rows.push_back(row);
    }
  }
  return table;
}

}  // namespace kiloamp
