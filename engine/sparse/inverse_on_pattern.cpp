#include "engine/sparse/inverse_on_pattern.hpp"

#include <cstddef>
#include <ranges>

#include "engine/sparse/front_matrix.hpp"
#include "engine/sparse/run_tasks.hpp"

namespace kiloamp::sparse {
namespace {

/// Pivots of a front inverted in one pass over its other rows; two keep all sums in registers.
constexpr Index kInverseBlock = 2;
/// Entries fetched in advance of their use, which jumps about in memory.
constexpr std::size_t kAhead = 32;

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
class Inverter {
 public:
  static constexpr int kWidth = padded_width(Lanes);
  using Entry = Pack<Scalar, kWidth>;
  using Front = FrontMatrix<Scalar, kWidth>;
  using Stripe = typename Front::Stripe;

  using Workspace = InverseWorkspace<Scalar, kWidth>;

  Inverter(const LaneFactors<Scalar, kWidth>& factors, Workspace& workspace,
           typename Workspace::Worker& worker, InverseOnPattern<Scalar, Lanes>& inverse)
      : factors_(factors),
        plan_(*factors.plan),
        slots_(workspace.slots.get()),
        kept_(workspace.kept),
        inverse_(inverse),
        stack_(worker.stack),
        scratch_(worker.scratch) {}

  void run(Index task) {
    if (stack_.size() < factors_.layout.inverse_stack[at(task)]) {
      stack_.resize(factors_.layout.inverse_stack[at(task)]);
    }
    if (task < plan_.tasks) {
      for (Index k = plan_.overflow_begin[at(task)]; k < plan_.overflow_begin[at(task) + 1]; ++k) {
        slots_[at(plan_.slots() + k)] = slots_[at(plan_.overflow_target[at(k)])];
      }
    }
    for (const Index s : std::views::reverse(plan_.steps_of(task))) {
      const auto& step = plan_.steps[at(s)];
      if (step.front < 0) {
        invert_narrow(s);
      } else {
        invert_front(step.front);
      }
    }
  }

  /// Hands out share `share` of `shares`, in the caller's order: to read here and there is cheaper than to
  /// write here and there.
  void deliver(Index share, Index shares) {
    const auto hand_out = [&](auto& to, const std::vector<Index>& slot_of) {
      const std::size_t end = to.size() * at(share + 1) / at(shares);
      for (std::size_t k = to.size() * at(share) / at(shares); k < end; ++k) {
        __builtin_prefetch(slots_ + slot_of[std::min(k + kAhead, end - 1)]);
        from_pack<Scalar, Lanes>(to[k], slots_[at(slot_of[k])]);
      }
    };
    hand_out(inverse_.diagonal, plan_.row_slot);
    hand_out(inverse_.off_diagonal, plan_.edge_slot);
  }

 private:
  template <int Count>
  void invert_column(Index p, const Index*& program_end) {
    const Index* const target = program_end - Count * (Count + 1) / 2;
    program_end = target;
    const Entry* const factor = factors_.slots.get() + plan_.column_begin[at(p)];
    Entry* const column = slots_ + plan_.column_begin[at(p)];
    Entry sum[Count > 0 ? Count : 1];
    for (int a = 0; a < Count; ++a) clear(sum[a]);
    for (int a = 0; a < Count; ++a) {
      for (int b = 0; b <= a; ++b) {
        const Entry& z = slots_[at(target[a * (a + 1) / 2 + b])];
        subtract_product(sum[a], z, factor[b]);
        if (b < a) subtract_product(sum[b], z, factor[a]);
      }
    }
    Entry diagonal = factor[Count];
    for (int a = 0; a < Count; ++a) {
      subtract_product(diagonal, factor[a], sum[a]);
      column[a] = sum[a];
    }
    column[Count] = diagonal;
  }

  void invert_narrow(Index s) {
    const auto& step = plan_.steps[at(s)];
    const Index* end = plan_.targets.data() + (step.target_begin + step.targets);
    for (Index p = step.first + step.columns; p-- > step.first;) {
      switch (plan_.diagonal_slot(p) - plan_.column_begin[at(p)]) {
        case 0:
          invert_column<0>(p, end);
          break;
        case 1:
          invert_column<1>(p, end);
          break;
        case 2:
          invert_column<2>(p, end);
          break;
        default:
          invert_column<3>(p, end);
          break;
      }
    }
  }

  Front inverse_of(Index f) { return {stack_.data() + factors_.layout.inverse_at[at(f)]}; }

  /// Rows of `child` picked out of its parent's inverse.
  void pick(const Front& to, const EliminationPlan::Front& child, const Front& parent) {
    const Index* const map = plan_.row_map.data() + child.map_begin;
    for (Index r = 0; r < child.rows; ++r) {
      Stripe* const row = to.row(r);
      const Stripe* const from = parent.row(map[r]);
      clear(row[Front::stripes(r) - 1]);
      for (Index c = 0; c <= r; ++c) {
        Entry entry{};
        Front::get(entry, from, map[c]);
        Front::set(row, c, entry);
      }
    }
  }

  void invert_front(Index f) {
    const auto& front = plan_.fronts[at(f)];
    const Front matrix = inverse_of(f);
    if (is_detached(plan_, f)) {
      const Stripe* const from = kept_.data() + factors_.layout.update_at[at(f)];
      const std::size_t count = Front::row_start(front.rows);
      for (std::size_t t = 0; t < count; ++t) matrix.data[t] = from[t];
    } else if (front.parent >= 0) {
      pick(matrix, front, inverse_of(front.parent));
    }
    const Index size = front.rows + front.pivots;
    const std::size_t stripes = Front::stripes(size);
    if (scratch_.size() < 2 * kInverseBlock * stripes) scratch_.resize(2 * kInverseBlock * stripes);
    for (Index begin = front.rows; begin < size;) {
      const Index count = std::min(kInverseBlock, size - begin);
      if (count == 1) {
        invert_block<1>(matrix, front, begin);
      } else {
        invert_block<2>(matrix, front, begin);
      }
      begin += count;
    }
    for (Index q = 0; q < front.pivots; ++q) {
      Entry* const column = slots_ + plan_.column_begin[at(front.first + front.pivots - 1 - q)];
      const Stripe* const row = matrix.row(front.rows + q);
      for (Index c = 0; c <= front.rows + q; ++c) Front::get(column[c], row, c);
    }
    for (Index k = plan_.child_begin[at(f)]; k < plan_.child_begin[at(f) + 1]; ++k) {
      const Index child = plan_.children[at(k)];
      if (!is_detached(plan_, child)) continue;
      pick({kept_.data() + factors_.layout.update_at[at(child)]}, plan_.fronts[at(child)], matrix);
    }
  }

  /// Rows begin .. begin + Count - 1 of the inverse from the rows before them.
  template <int Count>
  void invert_block(const Front& matrix, const EliminationPlan::Front& front, Index begin) {
    const std::size_t stripes = begin > 0 ? Front::stripes(begin - 1) : 0;
    const Entry* factor[Count];
    Stripe* w[Count];
    Stripe* y[Count];
    for (Index q = 0; q < Count; ++q) {
      factor[q] = factors_.slots.get() +
                  plan_.column_begin[at(front.first + front.rows + front.pivots - 1 - begin - q)];
      w[q] = scratch_.data() + at(2 * q) * stripes;
      y[q] = w[q] + stripes;
      for (std::size_t t = 0; t < stripes; ++t) clear(y[q][t]);
      if (stripes > 0) clear(w[q][stripes - 1]);
      for (Index c = 0; c < begin; ++c) {
        Entry entry{};
        negate(entry, factor[q][c]);
        for (Index b = 0; b < q; ++b) {
          Entry inner;
          Front::get(inner, w[b], c);
          subtract_product(entry, inner, factor[q][begin + b]);
        }
        Front::set(w[q], c, entry);
      }
    }
    multiply_symmetric<Count>(matrix, begin, w, y);
    for (Index q = 0; q < Count; ++q) {
      Stripe* const row = matrix.row(begin + q);
      clear(row[Front::stripes(begin + q) - 1]);
      for (std::size_t t = 0; t < stripes; ++t) row[t] = y[q][t];
    }
    for (Index q = 0; q < Count; ++q) close_row(matrix, begin, begin + q, factor[q]);
  }

  /// y = Z w with Z the first `size` rows; w carries the minus sign.
  template <int Count>
  void multiply_symmetric(const Front& matrix, Index size, Stripe* const* w, Stripe* const* y) {
    const Stripe* const_w[Count];
    for (int q = 0; q < Count; ++q) const_w[q] = w[q];
    for (Index r = 0; r < size; ++r) {
      const Stripe* const row = matrix.row(r);
      const std::size_t last = Front::stripes(r) - 1;
      Stripe spread[Count];
      Stripe dot[Count];
      Entry entry{};
      for (int q = 0; q < Count; ++q) {
        Front::get(entry, w[q], r);
        Front::spread(spread[q], entry);
        clear(dot[q]);
      }
      symmetric_row<Count>(row, last, spread, const_w, y, dot);
      Stripe tail = row[last];  // the diagonal entry belongs to one of the two products only
      for (int q = 0; q < Count; ++q) add_product(y[q][last], tail, spread[q]);
      clear(entry);
      Front::set(&tail, r % Front::kPerStripe, entry);
      for (int q = 0; q < Count; ++q) {
        add_product(dot[q], tail, w[q][last]);
        Entry sum;
        Front::gather_sum(sum, dot[q]);
        Front::get(entry, y[q], r);
        add(entry, sum);
        Front::set(y[q], r, entry);
      }
    }
  }

  /// Entries of row `row` from column `begin` on, the others being known.
  void close_row(const Front& matrix, Index begin, Index row, const Entry* factor) {
    Stripe* const mine = matrix.row(row);
    for (Index c = begin; c < row; ++c) {
      const Stripe* const other = matrix.row(c);
      Entry sum;
      Entry entry{};
      clear(sum);
      for (Index i = 0; i < row; ++i) {
        Front::get(entry, i <= c ? other : matrix.row(i), i <= c ? i : c);
        subtract_product(sum, entry, factor[i]);
      }
      Front::set(mine, c, sum);
    }
    Entry diagonal = factor[row];
    for (Index i = 0; i < row; ++i) {
      Entry entry{};
      Front::get(entry, mine, i);
      subtract_product(diagonal, entry, factor[i]);
    }
    Front::set(mine, row, diagonal);
  }

  const LaneFactors<Scalar, kWidth>& factors_;
  const EliminationPlan& plan_;
  Entry* slots_;
  std::vector<Stripe>& kept_;
  InverseOnPattern<Scalar, Lanes>& inverse_;
  std::vector<Stripe>& stack_;
  std::vector<Stripe>& scratch_;
};

}  // namespace

template <typename Scalar, int Lanes>
void invert_on_pattern(const LaneFactors<Scalar, padded_width(Lanes)>& factors,
                       InverseWorkspace<Scalar, padded_width(Lanes)>& workspace,
                       InverseOnPattern<Scalar, Lanes>& inverse, int threads) {
  using Worker = Inverter<Scalar, Lanes>;
  const EliminationPlan& plan = *factors.plan;
  inverse.diagonal.resize(at(plan.order));
  inverse.off_diagonal.resize(plan.edges);
  if (!workspace.slots) {
    workspace.slots = LineArray<typename Worker::Entry>(plan.all_slots());
    workspace.kept.resize(factors.layout.kept);
  }
  const std::size_t count = at(std::max(threads, 1));
  if (workspace.workers.size() < count) workspace.workers.resize(count);
  std::vector<Worker> workers;
  for (auto& worker : workspace.workers) workers.emplace_back(factors, workspace, worker, inverse);
  workers[0].run(plan.tasks);
  run_tasks(plan.tasks, threads, [&](int task, int worker) { workers[at(worker)].run(task); });
  const Index shares = std::max<Index>(plan.tasks, 1);
  run_tasks(shares, threads, [&](int share, int worker) { workers[at(worker)].deliver(share, shares); });
}

#define KILOAMP_INSTANTIATE(Scalar, Lanes)                                                        \
  template void invert_on_pattern<Scalar, Lanes>(const LaneFactors<Scalar, padded_width(Lanes)>&, \
                                                 InverseWorkspace<Scalar, padded_width(Lanes)>&,  \
                                                 InverseOnPattern<Scalar, Lanes>&, int);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 3)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE

}  // namespace kiloamp::sparse
