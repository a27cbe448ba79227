#include "engine/sparse/column_solver.hpp"

#include <algorithm>
#include <cstddef>
#include <functional>
#include <limits>
#include <ranges>
#include <utility>

#include "engine/sparse/wide_registers.hpp"
#if KILOAMP_WIDE_REGISTERS
#include <immintrin.h>
#endif

namespace kiloamp::sparse {
namespace {

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

/// to -= factor (one number) * x
template <int Block>
inline void subtract_scaled(Pack<double, Block>& to, double factor, const Pack<double, Block>& x) {
  to.re -= factor * x.re;
}
template <int Block>
inline void subtract_scaled(Pack<std::complex<double>, Block>& to, std::complex<double> factor,
                            const Pack<std::complex<double>, Block>& x) {
  to.re -= factor.real() * x.re;
  to.re += factor.imag() * x.im;
  to.im -= factor.real() * x.im;
  to.im -= factor.imag() * x.re;
}

/// What one backward pass works on.
template <typename Entry, typename Row>
struct BackwardPass {
  const EliminationPlan& plan;
  const Entry* slots;
  Row* x;
  const std::vector<Index>& stamps;  // equal to `stamp` where there is a right-hand side
  Index stamp;
};

#if KILOAMP_WIDE_REGISTERS
/// Four right-hand sides of complex numbers are two registers; all sums stay in registers. Lanes outside
/// [First, End) get zeros.
template <int Lanes, int First, int End, typename Entry, typename Row>
KILOAMP_WIDE inline void backward_wide(const BackwardPass<Entry, Row>& pass, Index p) {
  constexpr int kWidth = padded_width(Lanes);
  static_assert(sizeof(Entry) == 2 * kWidth * sizeof(double) && sizeof(Row) == 8 * Lanes * sizeof(double));
  const Index begin = pass.plan.column_begin[at(p)];
  const Index end = pass.plan.diagonal_slot(p);
  __m256d re[Lanes];
  __m256d im[Lanes];
  for (int s = 0; s < Lanes; ++s) re[s] = im[s] = _mm256_setzero_pd();
  const auto* factor = reinterpret_cast<const double*>(pass.slots + begin);
  for (Index slot = begin; slot < end; ++slot, factor += 2 * kWidth) {
    const auto* const x = reinterpret_cast<const double*>(pass.x + pass.plan.rows[at(slot)]);
    for (int s = First; s < End; ++s) {
      const __m256d factor_re = _mm256_broadcast_sd(factor + s);
      const __m256d factor_im = _mm256_broadcast_sd(factor + kWidth + s);
      const __m256d x_re = _mm256_loadu_pd(x + 8 * s);
      const __m256d x_im = _mm256_loadu_pd(x + 8 * s + 4);
      re[s] = _mm256_fnmadd_pd(factor_re, x_re, re[s]);
      im[s] = _mm256_fnmadd_pd(factor_re, x_im, im[s]);
      re[s] = _mm256_fmadd_pd(factor_im, x_im, re[s]);
      im[s] = _mm256_fnmadd_pd(factor_im, x_re, im[s]);
    }
  }
  auto* const mine = reinterpret_cast<double*>(pass.x + p);
  if (pass.stamps[at(p)] == pass.stamp) {
    for (int s = First; s < End; ++s) {
      const __m256d factor_re = _mm256_broadcast_sd(factor + s);
      const __m256d factor_im = _mm256_broadcast_sd(factor + kWidth + s);
      const __m256d x_re = _mm256_loadu_pd(mine + 8 * s);
      const __m256d x_im = _mm256_loadu_pd(mine + 8 * s + 4);
      re[s] = _mm256_fmadd_pd(factor_re, x_re, re[s]);
      im[s] = _mm256_fmadd_pd(factor_re, x_im, im[s]);
      re[s] = _mm256_fnmadd_pd(factor_im, x_im, re[s]);
      im[s] = _mm256_fmadd_pd(factor_im, x_re, im[s]);
    }
  }
  for (int s = 0; s < Lanes; ++s) {
    _mm256_storeu_pd(mine + 8 * s, re[s]);
    _mm256_storeu_pd(mine + 8 * s + 4, im[s]);
  }
}

template <int Lanes, int First, int End, typename Entry, typename Row, typename Range>
KILOAMP_WIDE void backward_wide(const BackwardPass<Entry, Row>& pass, const Range& positions) {
  for (const Index p : positions) backward_wide<Lanes, First, End>(pass, p);
}
#endif

}  // namespace

template <typename Scalar, int Lanes, int Block>
ColumnSolver<Scalar, Lanes, Block>::ColumnSolver(const LaneFactors<Scalar, padded_width(Lanes)>& factors)
    : factors_(&factors),
      plan_(factors.plan.get()),
      x_(at(plan_->order)),
      forward_stamp_(at(plan_->order), 0),
      wanted_stamp_(at(plan_->order), 0) {
  clear();
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::clear() {
  path_.clear();
  filled_ = {};
  if (stamp_ == std::numeric_limits<Index>::max()) {
    std::fill(forward_stamp_.begin(), forward_stamp_.end(), 0);
    std::fill(wanted_stamp_.begin(), wanted_stamp_.end(), 0);
    stamp_ = 0;
  }
  ++stamp_;
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::add_path(std::vector<Index>& path, std::vector<Index>& stamps,
                                                  Index position) {
  for (; position >= 0 && stamps[at(position)] != stamp_; position = plan_->parent(position)) {
    stamps[at(position)] = stamp_;
    path.push_back(position);
  }
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::put(int which, Index row, const Entry& value) {
  const Index position = plan_->position_of[at(row)];
  const std::size_t known = path_.size();
  add_path(path_, forward_stamp_, position);
  for (std::size_t k = known; k < path_.size(); ++k) x_[at(path_[k])] = Row{};
  for (std::size_t s = 0; s < at(Lanes); ++s) {
    filled_[s] = filled_[s] || value[s] != Scalar(0);
    auto& x = x_[at(position)][s];
    set_lane<kBlock>(x.re, which, x.re[which] + std::real(value[s]));
    if constexpr (kIsComplex<Scalar>) set_lane<kBlock>(x.im, which, x.im[which] + std::imag(value[s]));
  }
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::forward() {
  std::sort(path_.begin(), path_.end());
  for (const Index p : path_) {
    const Row& x = x_[at(p)];
    for (Index slot = plan_->column_begin[at(p)]; slot < plan_->diagonal_slot(p); ++slot) {
      const auto& factor = factors_->slots[at(slot)];
      Row& to = x_[at(plan_->rows[at(slot)])];
      for (int s = 0; s < Lanes; ++s) subtract_scaled(to[at(s)], lane_of(factor, s), x[at(s)]);
    }
  }
}

template <typename Scalar, int Lanes, int Block>
template <int First, int End>
void ColumnSolver<Scalar, Lanes, Block>::backward(Index p) {
  const auto* const slots = factors_->slots.get();
  const Index* const rows = plan_->rows.data();
  const Index end = plan_->diagonal_slot(p);
  Row sum{};
  for (Index slot = plan_->column_begin[at(p)]; slot < end; ++slot) {
    const Row& x = x_[at(rows[slot])];
    for (int s = First; s < End; ++s) subtract_scaled(sum[at(s)], lane_of(slots[slot], s), x[at(s)]);
  }
  if (forward_stamp_[at(p)] == stamp_) {
    const auto& inverse = slots[end];
    for (int s = First; s < End; ++s) subtract_scaled(sum[at(s)], -lane_of(inverse, s), x_[at(p)][at(s)]);
  }
  x_[at(p)] = sum;
}

template <typename Scalar, int Lanes, int Block>
template <typename Range>
void ColumnSolver<Scalar, Lanes, Block>::backward_all(const Range& positions) {
  const auto with = [&]<int First, int End>(std::integer_sequence<int, First, End>) {
#if KILOAMP_WIDE_REGISTERS
    if constexpr (kIsComplex<Scalar> && Block == 4) {
      if (has_wide_registers()) {
        const BackwardPass<Pack<Scalar, padded_width(Lanes)>, Row> pass{*plan_, factors_->slots.get(),
                                                                        x_.get(), forward_stamp_, stamp_};
        backward_wide<Lanes, First, End>(pass, positions);
        return;
      }
    }
#endif
    for (const Index p : positions) backward<First, End>(p);
  };
  if constexpr (Lanes == 3) {  // the last, the last two or the outer two without a right-hand side
    if (!filled_[2] && !filled_[1]) return with(std::integer_sequence<int, 0, 1>{});
    if (!filled_[2] && !filled_[0]) return with(std::integer_sequence<int, 1, 2>{});
    if (!filled_[2]) return with(std::integer_sequence<int, 0, 2>{});
  }
  with(std::integer_sequence<int, 0, Lanes>{});
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::solve() {
  forward();
  backward_all(std::views::iota(Index{0}, plan_->order) | std::views::reverse);
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::solve_at(std::span<const Index> wanted) {
  forward();
  wanted_path_.clear();
  for (const Index row : wanted) add_path(wanted_path_, wanted_stamp_, plan_->position_of[at(row)]);
  std::sort(wanted_path_.begin(), wanted_path_.end(), std::greater<>());
  backward_all(wanted_path_);
}

template <typename Scalar, int Lanes, int Block>
typename ColumnSolver<Scalar, Lanes, Block>::Entry ColumnSolver<Scalar, Lanes, Block>::get(int which,
                                                                                           Index row) const {
  const Row& x = x_[at(plan_->position_of[at(row)])];
  Entry out;
  for (std::size_t s = 0; s < at(Lanes); ++s) out[s] = lane_of(x[s], which);
  return out;
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::copy(int which, std::span<Entry> out) const {
  for (std::size_t row = 0; row < out.size(); ++row) out[row] = get(which, static_cast<Index>(row));
}

template <typename Scalar, int Lanes, int Block>
void ColumnSolver<Scalar, Lanes, Block>::set(int which, Index row, int lane, Scalar value) {
  auto& x = x_[at(position(row))][at(lane)];
  set_lane<kBlock>(x.re, which, std::real(value));
  if constexpr (kIsComplex<Scalar>) set_lane<kBlock>(x.im, which, std::imag(value));
}

template <typename Scalar, int Lanes, int Block>
Index ColumnSolver<Scalar, Lanes, Block>::position(Index row) const {
  return plan_->position_of[at(row)];
}

template class ColumnSolver<std::complex<double>, 1, 2>;
template class ColumnSolver<std::complex<double>, 1, 4>;
template class ColumnSolver<std::complex<double>, 3, 2>;
template class ColumnSolver<std::complex<double>, 3, 4>;
template class ColumnSolver<std::complex<double>, 4, 2>;
template class ColumnSolver<std::complex<double>, 4, 4>;
template class ColumnSolver<double, 1, 2>;
template class ColumnSolver<double, 1, 4>;
template class ColumnSolver<double, 2, 2>;
template class ColumnSolver<double, 2, 4>;
template class ColumnSolver<double, 4, 2>;
template class ColumnSolver<double, 4, 4>;

}  // namespace kiloamp::sparse
