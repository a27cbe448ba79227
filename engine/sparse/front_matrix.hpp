// Dense lower triangle of a front in stripes of four doubles, and the kernels on it.
#pragma once
#include <algorithm>
#include <cstddef>

#include "engine/sparse/lane_pack.hpp"
#include "engine/sparse/pattern.hpp"

namespace kiloamp::sparse {

/// Rows of a symmetric matrix, lower triangle, `Width` lanes.
///
/// A stripe holds kPerStripe = 4 / Width neighbouring entries of a row, so that kernels always work on four
/// doubles. Row r has r + 1 entries in stripes(r) stripes; places beyond the diagonal are padding.
template <typename Scalar, int Width>
struct FrontMatrix {
  using Stripe = Pack<Scalar, 4>;
  using Entry = Pack<Scalar, Width>;
  static constexpr int kPerStripe = 4 / Width;

  Stripe* data;

  static std::size_t stripes(Index row) { return static_cast<std::size_t>(row) / kPerStripe + 1; }
  /// Stripes before `row`, hence also the size of a triangle of `row` rows.
  static std::size_t row_start(Index row) {
    const std::size_t whole = static_cast<std::size_t>(row) / kPerStripe;
    const std::size_t rest = static_cast<std::size_t>(row) % kPerStripe;
    return (whole + 1) * (kPerStripe * whole + 2 * rest) / 2;
  }
  Stripe* row(Index r) const { return data + row_start(r); }

  static void get(Entry& to, const Stripe* row, Index column) {
    if constexpr (Width == 4) {
      to = row[column];
    } else {
      const Stripe& stripe = row[column / kPerStripe];
      to.re = *place<const Doubles<Width>>(stripe.re, column);
      if constexpr (kIsComplex<Scalar>) to.im = *place<const Doubles<Width>>(stripe.im, column);
    }
  }
  static void set(Stripe* row, Index column, const Entry& from) {
    if constexpr (Width == 4) {
      row[column] = from;
    } else {
      Stripe& stripe = row[column / kPerStripe];
      *place<Doubles<Width>>(stripe.re, column) = from.re;
      if constexpr (kIsComplex<Scalar>) *place<Doubles<Width>>(stripe.im, column) = from.im;
    }
  }
  /// The same entry in every place of a stripe.
  static void spread(Stripe& to, const Entry& from) {
    to.re = repeated(from.re);
    if constexpr (kIsComplex<Scalar>) to.im = repeated(from.im);
  }
  /// Sum of the places of a stripe.
  static void gather_sum(Entry& to, const Stripe& from) {
    get(to, &from, 0);
    for (Index c = 1; c < kPerStripe; ++c) {
      Entry other;
      get(other, &from, c);
      add(to, other);
    }
  }

 private:
  /// Where the lanes of an entry lie in its stripe. An address: to choose among registers would be a jump
  /// that the machine cannot guess.
  template <typename To, typename Four>
  static To* place(Four& four, Index column) {
    return reinterpret_cast<To*>(&four) + column % kPerStripe;
  }
};

/// row -= sum over q of factor[q] * pivot[q]: `Count` eliminations at one pass over the row.
template <int Count, typename Stripe>
inline void eliminate_from_row(Stripe* __restrict row, std::size_t stripes, const Stripe* const* pivot,
                               const Stripe* factor) {
  for (std::size_t t = 0; t < stripes; ++t) {
    Stripe sum = row[t];
    for (int q = 0; q < Count; ++q) subtract_product(sum, factor[q], pivot[q][t]);
    row[t] = sum;
  }
}

/// One row of a symmetric product Y = Z W for `Count` vectors: adds z[t] * factor[q] to y[q][t] and
/// accumulates z[t] * w[q][t] in dot[q].
template <int Count, typename Stripe>
inline void symmetric_row(const Stripe* __restrict z, std::size_t stripes, const Stripe* factor,
                          const Stripe* const* w, Stripe* const* y, Stripe* dot) {
  Stripe sums[Count];
  for (int q = 0; q < Count; ++q) sums[q] = dot[q];
  for (std::size_t t = 0; t < stripes; ++t) {
    const Stripe value = z[t];
    for (int q = 0; q < Count; ++q) {
      Stripe sum = y[q][t];
      add_product(sum, value, factor[q]);
      y[q][t] = sum;
      add_product(sums[q], value, w[q][t]);
    }
  }
  for (int q = 0; q < Count; ++q) dot[q] = sums[q];
}

}  // namespace kiloamp::sparse
