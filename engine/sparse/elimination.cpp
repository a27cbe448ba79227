#include "engine/sparse/elimination.hpp"

#include <cmath>
#include <cstddef>

#include "engine/sparse/front_matrix.hpp"
#include "engine/sparse/run_tasks.hpp"

namespace kiloamp::sparse {
namespace {

/// Pivots of a front eliminated in one pass over its other rows.
constexpr Index kPivotBlock = 4;
/// Slots fetched in advance of their use, which jumps about in memory.
constexpr std::size_t kAhead = 32;
/// Keeps the mark of a zero pivot infinite where the whole row is zero (0 / 0 otherwise).
constexpr double kTinySquared = std::numeric_limits<double>::min();

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
class Eliminator {
 public:
  static constexpr int kWidth = padded_width(Lanes);
  using Entry = Pack<Scalar, kWidth>;
  using Front = FrontMatrix<Scalar, kWidth>;
  using Stripe = typename Front::Stripe;
  using Size = Doubles<kWidth>;

  using Workspace = EliminationWorkspace<Scalar>;

  Eliminator(LaneFactors<Scalar, kWidth>& factors, const Values<Scalar, Lanes>& values, Workspace& workspace,
             typename Workspace::Worker& worker)
      : factors_(factors),
        plan_(*factors.plan),
        values_(values),
        kept_(workspace.kept),
        front_(worker.front),
        stack_(worker.stack) {}

  /// Puts share `share` of `shares` of A in its slots and notes the largest entry. In the caller's order: to
  /// write here and there does not keep the machine waiting, to read here and there does.
  void place_input(Index share, Index shares) {
    auto& largest = factors_.largest_input_squared[at(share)];
    largest = {};
    const auto begin = [&](std::size_t count) { return count * at(share) / at(shares); };
    const auto end = [&](std::size_t count) { return count * at(share + 1) / at(shares); };
    const auto place = [&](const auto& entries, const std::vector<Index>& slot_of, double padding) {
      // Several sums and maxima side by side: each would wait for itself.
      constexpr std::size_t kApart = 4;
      Size met[kApart] = {};
      Size sum[kApart] = {};
      const auto include = [&](std::size_t k, std::size_t apart) {
        Entry entry;
        to_pack<Scalar, Lanes>(entry, entries[k], padding);
        factors_.slots[at(slot_of[k])] = entry;
        Size size;
        square_size(size, entry);
        keep_larger<kWidth>(met[apart], size);
        sum[apart] += size;
      };
      std::size_t k = begin(entries.size());
      for (; k + kAhead + kApart <= end(entries.size()); k += kApart) {
        for (std::size_t apart = 0; apart < kApart; ++apart) {
          __builtin_prefetch(&factors_.slots[at(slot_of[k + kAhead + apart])], 1);
          include(k + apart, apart);
        }
      }
      for (; k < end(entries.size()); ++k) include(k, 0);
      for (std::size_t apart = 0; apart < kApart; ++apart) {
        for (int lane = 0; lane < Lanes; ++lane) {
          const double total = get_lane<kWidth>(sum[apart], lane);
          largest[at(lane)] =
              std::max(largest[at(lane)], get_lane<kWidth>(met[apart], lane)) + (total - total);
        }
      }
    };
    place(values_.diagonal, plan_.row_slot, 1);
    place(values_.off_diagonal, plan_.edge_slot, 0);
    for (std::size_t k = begin(plan_.fill_slots.size()); k < end(plan_.fill_slots.size()); ++k)
      clear(factors_.slots[at(plan_.fill_slots[k])]);
  }

  void run(Index task) {
    watch_ = {};
    grown_ = Size{};
    unbounded_ = Size{};
    if (stack_.size() < factors_.layout.update_stack[at(task)]) {
      stack_.resize(factors_.layout.update_stack[at(task)]);
    }
    for (const Index s : plan_.steps_of(task)) {
      const auto& step = plan_.steps[at(s)];
      for (Index p = step.first; p < step.first + step.columns; ++p)
        square_size(factors_.diagonal_squared[at(p)], factors_.slots[at(plan_.diagonal_slot(p))]);
    }
    if (task < plan_.tasks) {
      for (Index k = plan_.overflow_begin[at(task)]; k < plan_.overflow_begin[at(task) + 1]; ++k) {
        clear(factors_.slots[at(plan_.slots() + k)]);
      }
    } else {
      for (std::size_t k = 0; k < plan_.overflow_target.size(); ++k) {
        add(factors_.slots[at(plan_.overflow_target[k])], factors_.slots[at(plan_.slots()) + k]);
      }
    }
    for (const Index s : plan_.steps_of(task)) {
      const auto& step = plan_.steps[at(s)];
      mark_ = Size{};
      largest_ = Size{};
      if (step.front < 0) {
        eliminate_narrow(step);
      } else {
        eliminate_front(step.front);
      }
      for (int lane = 0; lane < kWidth; ++lane) {
        watch_.offer(lane, get_lane<kWidth>(mark_, lane), s);
        double& largest = watch_.largest_squared[at(lane)];
        largest = std::max(largest, get_lane<kWidth>(largest_, lane));
      }
    }
    for (int lane = 0; lane < kWidth; ++lane) {
      watch_.grown[at(lane)] = get_lane<kWidth>(grown_, lane) + get_lane<kWidth>(unbounded_, lane);
    }
    factors_.watches[at(task)] = watch_;
  }

 private:
  /// Marks pivot p, |p|^2 = `pivot_size`, whose row has the largest |entry|^2 `size` beside the diagonal.
  void watch(Index p, Size size, const Size& pivot_size, const Size& inverse_size) {
    const Size& before = factors_.diagonal_squared[at(p)];
    keep_larger<kWidth>(largest_, size);
    Size met = size;
    keep_larger<kWidth>(met, pivot_size);
    keep_larger<kWidth>(grown_, met - kSuspectGrowth * kSuspectGrowth * before);
    keep_larger<kWidth>(size, before);
    size = (size + kTinySquared) * inverse_size;
    keep_larger<kWidth>(mark_, size);
    unbounded_ += size - size;
  }

  template <int Count>
  void eliminate_column(Index p, Entry* column, const Index*& target) {
    Entry inverse;
    Size pivot_size;
    Size inverse_size;
    invert(inverse, column[Count], pivot_size, inverse_size);
    Size size{};
    Entry scaled[Count > 0 ? Count : 1];
    for (int a = 0; a < Count; ++a) {
      multiply(scaled[a], column[a], inverse);
      for (int b = 0; b <= a; ++b) {
        subtract_product(factors_.slots[at(target[a * (a + 1) / 2 + b])], scaled[a], column[b]);
      }
      Size other;
      square_size(other, column[a]);
      keep_larger<kWidth>(size, other);
    }
    for (int a = 0; a < Count; ++a) column[a] = scaled[a];
    column[Count] = inverse;
    target += Count * (Count + 1) / 2;
    watch(p, size, pivot_size, inverse_size);
  }

  void eliminate_narrow(const EliminationPlan::Step& step) {
    const Index* target = plan_.targets.data() + step.target_begin;
    for (Index p = step.first; p < step.first + step.columns; ++p) {
      Entry* const column = factors_.slots.get() + plan_.column_begin[at(p)];
      switch (plan_.diagonal_slot(p) - plan_.column_begin[at(p)]) {
        case 0:
          eliminate_column<0>(p, column, target);
          break;
        case 1:
          eliminate_column<1>(p, column, target);
          break;
        case 2:
          eliminate_column<2>(p, column, target);
          break;
        default:
          eliminate_column<3>(p, column, target);
          break;
      }
    }
  }

  void eliminate_front(Index f) {
    const auto& front = plan_.fronts[at(f)];
    const Index size = front.rows + front.pivots;
    const std::size_t all = Front::row_start(size);
    if (front_.size() < all) front_.resize(factors_.layout.largest_front);
    const Front matrix{front_.data()};
    for (std::size_t t = 0; t < all; ++t) clear(matrix.data[t]);
    for (Index q = 0; q < front.pivots; ++q) {
      const Index p = front.first + front.pivots - 1 - q;
      const Entry* const column = factors_.slots.get() + plan_.column_begin[at(p)];
      Stripe* const row = matrix.row(front.rows + q);
      for (Index c = 0; c <= front.rows + q; ++c) Front::set(row, c, column[c]);
    }
    for (Index k = plan_.child_begin[at(f)]; k < plan_.child_begin[at(f) + 1]; ++k) {
      const Index child = plan_.children[at(k)];
      add_update(matrix, plan_.fronts[at(child)], update_of(child));
    }
    for (Index end = size; end > front.rows;) {
      const Index count = std::min(kPivotBlock, end - front.rows);
      end -= count;
      switch (count) {
        case 1:
          eliminate_block<1>(matrix, front, end);
          break;
        case 2:
          eliminate_block<2>(matrix, front, end);
          break;
        case 3:
          eliminate_block<3>(matrix, front, end);
          break;
        default:
          eliminate_block<4>(matrix, front, end);
          break;
      }
    }
    if (front.parent < 0) return;
    Stripe* const update = update_of(f).data;
    const std::size_t kept = Front::row_start(front.rows);
    for (std::size_t t = 0; t < kept; ++t) update[t] = matrix.data[t];
  }

  Front update_of(Index f) {
    std::vector<Stripe>& where = is_detached(plan_, f) ? kept_ : stack_;
    return {where.data() + factors_.layout.update_at[at(f)]};
  }

  void add_update(const Front& matrix, const EliminationPlan::Front& child, const Front& update) {
    const Index* const map = plan_.row_map.data() + child.map_begin;
    for (Index r = 0; r < child.rows; ++r) {
      Stripe* const to = matrix.row(map[r]);
      const Stripe* const from = update.row(r);
      for (Index c = 0; c <= r; ++c) {
        Entry entry{};
        Entry part;
        Front::get(part, from, c);
        Front::get(entry, to, map[c]);
        add(entry, part);
        Front::set(to, map[c], entry);
      }
    }
  }

  /// Eliminates the rows begin .. begin + Count - 1 of the front from the rows before them.
  template <int Count>
  void eliminate_block(const Front& matrix, const EliminationPlan::Front& front, Index begin) {
    const Stripe* pivot_row[Count];
    Entry inverse[Count];
    for (Index q = Count - 1; q >= 0; --q) {
      const Index row = begin + q;
      pivot_row[q] = matrix.row(row);
      Entry pivot;
      Size pivot_size;
      Size inverse_size;
      Front::get(pivot, pivot_row[q], row);
      invert(inverse[q], pivot, pivot_size, inverse_size);
      for (Index r = begin; r < row; ++r) {
        const Stripe* const one[1] = {pivot_row[q]};
        Stripe factor[1];
        factor_at(factor[0], pivot_row[q], r, inverse[q]);
        eliminate_from_row<1>(matrix.row(r), Front::stripes(r), one, factor);
      }
      store_column(front.first + front.rows + front.pivots - 1 - row, pivot_row[q], row, inverse[q],
                   pivot_size, inverse_size);
    }
    for (Index r = 0; r < begin; ++r) {
      Stripe factor[Count];
      for (int q = 0; q < Count; ++q) factor_at(factor[q], pivot_row[q], r, inverse[q]);
      eliminate_from_row<Count>(matrix.row(r), Front::stripes(r), pivot_row, factor);
    }
  }

  static void factor_at(Stripe& factor, const Stripe* pivot_row, Index column, const Entry& inverse) {
    Entry entry{};
    Entry scaled;
    Front::get(entry, pivot_row, column);
    multiply(scaled, entry, inverse);
    Front::spread(factor, scaled);
  }

  void store_column(Index p, const Stripe* row, Index length, const Entry& inverse, const Size& pivot_size,
                    const Size& inverse_size) {
    Entry* const column = factors_.slots.get() + plan_.column_begin[at(p)];
    Size size{};
    for (Index c = 0; c < length; ++c) {
      Entry entry{};
      Size other;
      Front::get(entry, row, c);
      square_size(other, entry);
      keep_larger<kWidth>(size, other);
      multiply(column[c], entry, inverse);
    }
    column[length] = inverse;
    watch(p, size, pivot_size, inverse_size);
  }

  LaneFactors<Scalar, kWidth>& factors_;
  const EliminationPlan& plan_;
  const Values<Scalar, Lanes>& values_;
  std::vector<Stripe>& kept_;
  std::vector<Stripe>& front_;
  std::vector<Stripe>& stack_;
  PivotWatch<kWidth> watch_;
  Size mark_{};
  Size largest_{};
  Size grown_{};
  Size unbounded_{};  // 0 while all marks are finite, else NaN
};

}  // namespace

template <typename Scalar, int Lanes>
void eliminate(LaneFactors<Scalar, padded_width(Lanes)>& factors, EliminationWorkspace<Scalar>& workspace,
               const Values<Scalar, Lanes>& values, int threads) {
  using Worker = Eliminator<Scalar, Lanes>;
  workspace.kept.resize(factors.layout.kept);
  const int tasks = factors.plan->tasks;
  const std::size_t count = at(std::max(threads, 1));
  if (workspace.workers.size() < count) workspace.workers.resize(count);
  std::vector<Worker> workers;
  for (auto& worker : workspace.workers) workers.emplace_back(factors, values, workspace, worker);
  const auto shares = static_cast<Index>(factors.largest_input_squared.size());
  run_tasks(shares, threads, [&](int share, int worker) { workers[at(worker)].place_input(share, shares); });
  run_tasks(tasks, threads, [&](int task, int worker) { workers[at(worker)].run(task); });
  workers[0].run(tasks);
}

template <typename Scalar, int Width>
Index worst_pivot(const LaneFactors<Scalar, Width>& factors, Index step_number, int lane) {
  const auto& plan = *factors.plan;
  const auto& step = plan.steps[at(step_number)];
  Index worst = step.first;
  double worst_mark = -1;
  for (Index p = step.first; p < step.first + step.columns; ++p) {
    const auto inverse = factors.slots[at(plan.diagonal_slot(p))];
    double mark = get_lane<Width>(factors.diagonal_squared[at(p)], lane) * std::norm(lane_of(inverse, lane));
    for (Index slot = plan.column_begin[at(p)]; slot < plan.diagonal_slot(p); ++slot) {
      mark = std::max(mark, std::norm(lane_of(factors.slots[at(slot)], lane)));
    }
    if (!std::isfinite(mark)) return p;
    if (mark > worst_mark) {
      worst_mark = mark;
      worst = p;
    }
  }
  return worst;
}

#define KILOAMP_INSTANTIATE(Scalar, Lanes)                                          \
  template void eliminate<Scalar, Lanes>(LaneFactors<Scalar, padded_width(Lanes)>&, \
                                         EliminationWorkspace<Scalar>&, const Values<Scalar, Lanes>&, int);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 3)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE
template Index worst_pivot(const LaneFactors<std::complex<double>, 1>&, Index, int);
template Index worst_pivot(const LaneFactors<std::complex<double>, 4>&, Index, int);
template Index worst_pivot(const LaneFactors<double, 1>&, Index, int);
template Index worst_pivot(const LaneFactors<double, 2>&, Index, int);
template Index worst_pivot(const LaneFactors<double, 4>&, Index, int);

}  // namespace kiloamp::sparse
