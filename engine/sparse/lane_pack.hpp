// One matrix entry in several lanes at once, real and imaginary parts apart, and its arithmetic.
#pragma once
#include <array>
#include <complex>
#include <cstddef>
#include <type_traits>

namespace kiloamp::sparse {

/// Two doubles in one register; the vector extension of GCC and Clang.
using TwoDoubles = double __attribute__((vector_size(16)));

/// One double of a pair. Constant subscripts: GCC 12 under sanitizers reads a variable subscript of a vector
/// before it is set.
inline double get_of(const TwoDoubles& pair, int k) { return k == 0 ? pair[0] : pair[1]; }
inline void set_of(TwoDoubles& pair, int k, double value) {
  if (k == 0) {
    pair[0] = value;
  } else {
    pair[1] = value;
  }
}

/// Four doubles as two pairs. Not a 32-byte vector: where the machine has none, GCC 12 keeps such a vector in
/// memory, which measured five times slower in the column solver.
struct FourDoubles {
  TwoDoubles low;
  TwoDoubles high;

  double operator[](int k) const { return k < 2 ? get_of(low, k) : get_of(high, k - 2); }
  FourDoubles& operator+=(const FourDoubles& b) {
    low += b.low;
    high += b.high;
    return *this;
  }
  FourDoubles& operator-=(const FourDoubles& b) {
    low -= b.low;
    high -= b.high;
    return *this;
  }
  friend FourDoubles operator+(FourDoubles a, const FourDoubles& b) { return a += b; }
  friend FourDoubles operator-(FourDoubles a, const FourDoubles& b) { return a -= b; }
  friend FourDoubles operator-(const FourDoubles& a) { return {-a.low, -a.high}; }
  friend FourDoubles operator*(const FourDoubles& a, const FourDoubles& b) {
    return {a.low * b.low, a.high * b.high};
  }
  friend FourDoubles operator*(double a, const FourDoubles& b) { return {a * b.low, a * b.high}; }
  friend FourDoubles operator/(double a, const FourDoubles& b) { return {a / b.low, a / b.high}; }
  friend FourDoubles operator+(const FourDoubles& a, double b) { return {a.low + b, a.high + b}; }
};

/// `Width` doubles that are handled together.
template <int Width>
struct DoublesOf;
template <>
struct DoublesOf<1> {
  using type = double;
};
template <>
struct DoublesOf<2> {
  using type = TwoDoubles;
};
template <>
struct DoublesOf<4> {
  using type = FourDoubles;
};
template <int Width>
using Doubles = typename DoublesOf<Width>::type;

/// b where it is larger than a, else a (also where b is not a number).
inline double larger(double a, double b) { return b > a ? b : a; }
inline TwoDoubles larger(TwoDoubles a, TwoDoubles b) { return b > a ? b : a; }
inline FourDoubles larger(const FourDoubles& a, const FourDoubles& b) {
  return {larger(a.low, b.low), larger(a.high, b.high)};
}

/// Lanes as stored: three are padded to four (the fourth is an identity matrix), which measured faster.
inline constexpr int padded_width(int lanes) { return lanes == 3 ? 4 : lanes; }

/// One entry of `Width` matrices.
template <typename Scalar, int Width>
struct Pack;

template <int Width>
struct Pack<double, Width> {
  Doubles<Width> re;
};

template <int Width>
struct Pack<std::complex<double>, Width> {
  Doubles<Width> re;
  Doubles<Width> im;
};

template <typename Scalar>
inline constexpr bool kIsComplex = !std::is_same_v<Scalar, double>;

inline double at_lane(const TwoDoubles& from, int lane) { return get_of(from, lane); }
inline double at_lane(const FourDoubles& from, int lane) { return from[lane]; }

template <int Width>
inline void set_lane(Doubles<Width>& to, int lane, double value) {
  if constexpr (Width == 1) {
    to = value;
  } else if constexpr (Width == 2) {
    set_of(to, lane, value);
  } else {
    set_of(lane < 2 ? to.low : to.high, lane % 2, value);
  }
}

template <int Width>
inline double get_lane(const Doubles<Width>& from, int lane) {
  if constexpr (Width == 1) {
    return from;
  } else {
    return at_lane(from, lane);
  }
}

template <int Width>
inline void clear(Pack<double, Width>& a) {
  a.re = Doubles<Width>{};
}
template <int Width>
inline void clear(Pack<std::complex<double>, Width>& a) {
  a.re = Doubles<Width>{};
  a.im = Doubles<Width>{};
}

/// a = -b
template <int Width>
inline void negate(Pack<double, Width>& a, const Pack<double, Width>& b) {
  a.re = -b.re;
}
template <int Width>
inline void negate(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b) {
  a.re = -b.re;
  a.im = -b.im;
}

/// a += b
template <int Width>
inline void add(Pack<double, Width>& a, const Pack<double, Width>& b) {
  a.re += b.re;
}
template <int Width>
inline void add(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b) {
  a.re += b.re;
  a.im += b.im;
}

/// a = b c
template <int Width>
inline void multiply(Pack<double, Width>& a, const Pack<double, Width>& b, const Pack<double, Width>& c) {
  a.re = b.re * c.re;
}
template <int Width>
inline void multiply(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b,
                     const Pack<std::complex<double>, Width>& c) {
  const Doubles<Width> re = b.re * c.re - b.im * c.im;
  a.im = b.re * c.im + b.im * c.re;
  a.re = re;
}

/// a += b c
template <int Width>
inline void add_product(Pack<double, Width>& a, const Pack<double, Width>& b, const Pack<double, Width>& c) {
  a.re += b.re * c.re;
}
template <int Width>
inline void add_product(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b,
                        const Pack<std::complex<double>, Width>& c) {
  a.re += b.re * c.re;
  a.re -= b.im * c.im;
  a.im += b.re * c.im;
  a.im += b.im * c.re;
}

/// a -= b c
template <int Width>
inline void subtract_product(Pack<double, Width>& a, const Pack<double, Width>& b,
                             const Pack<double, Width>& c) {
  a.re -= b.re * c.re;
}
template <int Width>
inline void subtract_product(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b,
                             const Pack<std::complex<double>, Width>& c) {
  a.re -= b.re * c.re;
  a.re += b.im * c.im;
  a.im -= b.re * c.im;
  a.im -= b.im * c.re;
}

/// size = |a|^2
template <int Width>
inline void square_size(Doubles<Width>& size, const Pack<double, Width>& a) {
  size = a.re * a.re;
}
template <int Width>
inline void square_size(Doubles<Width>& size, const Pack<std::complex<double>, Width>& a) {
  size = a.re * a.re + a.im * a.im;
}

/// a = 1 / b, size = |b|^2, inverse_size = 1 / |b|^2 (infinite where b = 0)
template <int Width>
inline void invert(Pack<double, Width>& a, const Pack<double, Width>& b, Doubles<Width>& size,
                   Doubles<Width>& inverse_size) {
  size = b.re * b.re;
  a.re = 1.0 / b.re;
  inverse_size = a.re * a.re;
}
template <int Width>
inline void invert(Pack<std::complex<double>, Width>& a, const Pack<std::complex<double>, Width>& b,
                   Doubles<Width>& size, Doubles<Width>& inverse_size) {
  size = b.re * b.re + b.im * b.im;
  inverse_size = 1.0 / size;
  a.im = -b.im * inverse_size;
  a.re = b.re * inverse_size;
}

/// a = larger(a, b) lane by lane
template <int Width>
inline void keep_larger(Doubles<Width>& a, const Doubles<Width>& b) {
  a = larger(a, b);
}

/// The same value in all places.
inline FourDoubles repeated(double a) { return {TwoDoubles{a, a}, TwoDoubles{a, a}}; }
inline FourDoubles repeated(TwoDoubles a) { return {a, a}; }
inline FourDoubles repeated(const FourDoubles& a) { return a; }

/// Gathers `part` of the lanes; padding lanes get `padding`.
template <int Lanes, typename Entry, typename Part>
inline Doubles<padded_width(Lanes)> gather_lanes(const Entry& from, const Part& part, double padding) {
  if constexpr (Lanes == 1) {
    return part(from[0]);
  } else if constexpr (Lanes == 2) {
    return TwoDoubles{part(from[0]), part(from[1])};
  } else if constexpr (Lanes == 3) {
    return FourDoubles{TwoDoubles{part(from[0]), part(from[1])}, TwoDoubles{part(from[2]), padding}};
  } else {
    return FourDoubles{TwoDoubles{part(from[0]), part(from[1])}, TwoDoubles{part(from[2]), part(from[3])}};
  }
}

/// Between the caller's entries (one Scalar per lane) and packs. Padding lanes get the real number `padding`.
template <typename Scalar, int Lanes>
inline void to_pack(Pack<Scalar, padded_width(Lanes)>& to, const std::array<Scalar, Lanes>& from,
                    double padding) {
  to.re = gather_lanes<Lanes>(
      from, [](const Scalar& value) { return std::real(value); }, padding);
  if constexpr (kIsComplex<Scalar>) {
    to.im = gather_lanes<Lanes>(
        from, [](const Scalar& value) { return std::imag(value); }, 0);
  }
}

template <typename Scalar, int Width>
inline Scalar lane_of(const Pack<Scalar, Width>& from, int lane) {
  if constexpr (kIsComplex<Scalar>) {
    return {get_lane<Width>(from.re, lane), get_lane<Width>(from.im, lane)};
  } else {
    return get_lane<Width>(from.re, lane);
  }
}

template <typename Scalar, int Lanes>
inline void from_pack(std::array<Scalar, Lanes>& to, const Pack<Scalar, padded_width(Lanes)>& from) {
  for (int s = 0; s < Lanes; ++s)
    to[static_cast<std::size_t>(s)] = lane_of<Scalar, padded_width(Lanes)>(from, s);
}

}  // namespace kiloamp::sparse
