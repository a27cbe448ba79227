#include "engine/study/outage_loops.hpp"

#include "engine/sparse/wide_registers.hpp"
#if KILOAMP_WIDE_REGISTERS
#include <immintrin.h>
#endif

namespace kiloamp::detail {

namespace {

using Four = sparse::FourDoubles;
using FourComplex = sparse::Pack<Complex, 4>;

FourComplex product(const FourComplex& a, const FourComplex& b) {
  return {a.re * b.re - a.im * b.im, a.re * b.im + a.im * b.re};
}
void add(FourComplex& to, const FourComplex& a) {
  to.re += a.re;
  to.im += a.im;
}
FourComplex repeated(Complex a) { return {sparse::repeated(a.real()), sparse::repeated(a.imag())}; }
Four squared_size(const FourComplex& a) { return a.re * a.re + a.im * a.im; }

void change_plain(const FourOutages& four, const std::vector<OutagePlace>& places, Four* three_phase,
                  Four* line_to_ground) {
  for (std::size_t p = 0; p < places.size(); ++p) {
    const OutagePlace& place = places[p];
    BySequence<FourComplex> z;
    for (int s = 0; s < 3; ++s) {
      const FourComplex& a = four.a->at_position(place.position)[four.lane[s]];
      FourComplex slope = product(four.gain[s][0], a);
      z[s] = repeated(place.intact[s]);
      if (four.second[s]) {
        const FourComplex& c = four.c->at_position(place.position)[four.lane[s]];
        add(slope, product(four.gain[s][1], c));
        add(z[s], product(product(four.gain[s][2], c), c));
      }
      add(z[s], product(slope, a));
    }
    FourComplex three = repeated(place.extra3), ground = repeated(place.extra1);
    add(three, z[kPositive]);
    for (const FourComplex& one : z) add(ground, one);
    three_phase[p] = squared_size(three);
    line_to_ground[p] = squared_size(ground);
  }
}

#if KILOAMP_WIDE_REGISTERS
struct Wide {
  __m256d re, im;
};

KILOAMP_WIDE inline Wide load(const FourComplex& from) {
  const auto* const numbers = reinterpret_cast<const double*>(&from);
  return {_mm256_loadu_pd(numbers), _mm256_loadu_pd(numbers + 4)};
}
/// to += a b
KILOAMP_WIDE inline void add_product(Wide& to, const Wide& a, const Wide& b) {
  to.re = _mm256_fmadd_pd(a.re, b.re, to.re);
  to.im = _mm256_fmadd_pd(a.re, b.im, to.im);
  to.re = _mm256_fnmadd_pd(a.im, b.im, to.re);
  to.im = _mm256_fmadd_pd(a.im, b.re, to.im);
}
KILOAMP_WIDE inline Wide product(const Wide& a, const Wide& b) {
  return {_mm256_fnmadd_pd(a.im, b.im, _mm256_mul_pd(a.re, b.re)),
          _mm256_fmadd_pd(a.im, b.re, _mm256_mul_pd(a.re, b.im))};
}
KILOAMP_WIDE inline __m256d squared_size(const Wide& a) {
  return _mm256_fmadd_pd(a.re, a.re, _mm256_mul_pd(a.im, a.im));
}
KILOAMP_WIDE inline Wide wide(Complex a) { return {_mm256_set1_pd(a.real()), _mm256_set1_pd(a.imag())}; }

/// Z' of one sequence.
KILOAMP_WIDE inline Wide changed(Complex intact, const Wide* gain, const FourComplex& a_at,
                                 const FourComplex* c_at) {
  const Wide a = load(a_at);
  Wide z = wide(intact), slope = product(gain[0], a);
  if (c_at != nullptr) {
    const Wide c = load(*c_at);
    add_product(slope, gain[1], c);
    add_product(z, product(gain[2], c), c);
  }
  add_product(z, slope, a);
  return z;
}

KILOAMP_WIDE void change_wide(const FourOutages& four, const std::vector<OutagePlace>& places,
                              Four* three_phase, Four* line_to_ground) {
  Wide gain[3][3];
  for (int s = 0; s < 3; ++s)
    for (std::size_t g = 0; g < 3; ++g) gain[s][g] = load(four.gain[s][g]);
  for (std::size_t p = 0; p < places.size(); ++p) {
    const OutagePlace& place = places[p];
    const auto& a = four.a->at_position(place.position);
    const auto& c = four.c->at_position(place.position);
    const auto of = [&](int s) { return four.second[s] ? &c[four.lane[s]] : nullptr; };
    const Wide z0 = changed(place.intact[kZero], gain[kZero], a[four.lane[kZero]], of(kZero));
    const Wide z1 = changed(place.intact[kPositive], gain[kPositive], a[four.lane[kPositive]], of(kPositive));
    const Wide z2 = changed(place.intact[kNegative], gain[kNegative], a[four.lane[kNegative]], of(kNegative));
    const Wide extra3 = wide(place.extra3), extra1 = wide(place.extra1);
    const Wide three{_mm256_add_pd(extra3.re, z1.re), _mm256_add_pd(extra3.im, z1.im)};
    const Wide ground{_mm256_add_pd(_mm256_add_pd(extra1.re, z0.re), _mm256_add_pd(z1.re, z2.re)),
                      _mm256_add_pd(_mm256_add_pd(extra1.im, z0.im), _mm256_add_pd(z1.im, z2.im))};
    _mm256_storeu_pd(reinterpret_cast<double*>(three_phase + p), squared_size(three));
    _mm256_storeu_pd(reinterpret_cast<double*>(line_to_ground + p), squared_size(ground));
  }
}
#endif

}  // namespace

void change_loops(const FourOutages& four, const std::vector<OutagePlace>& places,
                  std::vector<Four>& three_phase, std::vector<Four>& line_to_ground) {
#if KILOAMP_WIDE_REGISTERS
  if (sparse::has_wide_registers())
    return change_wide(four, places, three_phase.data(), line_to_ground.data());
#endif
  change_plain(four, places, three_phase.data(), line_to_ground.data());
}

}  // namespace kiloamp::detail
