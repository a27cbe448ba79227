#include <cmath>
#include <vector>

#include "engine/sequence/circuit.hpp"

namespace kiloamp {

namespace {

// An arm of a star circuit, in per unit of the transformer's rating; terminal -1: its end is earthed.
struct Arm {
  Complex z;
  int terminal;
};

struct Star {
  std::vector<Arm> arms;
  std::array<double, 3> winding_kv{};  // signed
  double mva = 0;
};

// Short-circuit impedance in per unit of its own rating from its magnitude and one way of saying its
// resistance.
template <typename Data>
Complex short_circuit_pu(const Data& d) {
  const double z = d.z_percent / 100;
  if (d.x_over_r) return std::polar(z, std::atan(*d.x_over_r));
  const double r = d.r_percent ? *d.r_percent / 100 : d.load_loss_kw.value_or(0) / 1000 / d.rated_mva;
  return {r, std::sqrt(std::max(0.0, z * z - r * r))};
}

// The same for zero sequence; without r0 the angle is that of the positive sequence.
template <typename Data>
Complex zero_short_circuit_pu(const Data& d) {
  const Complex z1 = short_circuit_pu(d);
  const double z0 = d.z0_percent.value_or(d.z_percent) / 100;
  if (!d.r0_percent) return z1 * (z0 / std::abs(z1));
  const double r0 = *d.r0_percent / 100;
  return {r0, std::sqrt(std::max(0.0, z0 * z0 - r0 * r0))};
}

Complex product_without(const std::vector<Arm>& arms, std::size_t i, std::size_t j) {
  Complex product = 1.0;
  for (std::size_t k = 0; k < arms.size(); ++k)
    if (k != i && k != j) product *= arms[k].z;
  return product;
}

// Eliminates the star point without dividing by an arm, so that an arm may be zero or negative:
// Y_ij = -prod_{k != i,j} z_k / D, D = sum_i prod_{k != i} z_k. Writes sequence `s` of the circuit in
// siemens.
void write_star(const Star& star, int s, Circuit& circuit) {
  circuit.group[s] = {-1, -1, -1};
  if (star.arms.size() < 2) return;
  Complex d = 0;
  for (std::size_t i = 0; i < star.arms.size(); ++i) d += product_without(star.arms, i, i);
  for (std::size_t i = 0; i < star.arms.size(); ++i) {
    const int a = star.arms[i].terminal;
    if (a < 0) {
      circuit.earthed[s] = true;
      continue;
    }
    circuit.group[s][a] = 0;
    const double kv_a = star.winding_kv[a];
    for (std::size_t j = 0; j < star.arms.size(); ++j) {
      if (j == i) continue;
      const Complex y = product_without(star.arms, i, j) / d * star.mva;
      circuit.y_siemens[s][a][a] += y / (kv_a * kv_a);
      const int b = star.arms[j].terminal;
      if (b >= 0) circuit.y_siemens[s][a][b] -= y / (kv_a * star.winding_kv[b]);
    }
  }
}

// Star-star groups with clock 2, 6 or 10 have their lower winding reversed.
double zero_sequence_sign(const ClockedWinding& winding) { return winding.clock % 4 == 2 ? -1.0 : 1.0; }

bool is_zigzag(Winding w) { return w == Winding::zigzag || w == Winding::zigzag_neutral; }

// 3 Zn in per unit of the winding for an earthed neutral, empty for a winding that zero-sequence current
// cannot enter.
std::optional<Complex> entry_pu(Winding winding, const std::optional<Neutral>& neutral, double mva,
                                double kv) {
  if (!has_neutral(winding)) return std::nullopt;
  const auto triple = triple_neutral_ohm(neutral);
  if (!triple) return std::nullopt;
  return *triple * mva / (kv * kv);
}

double tapped(double kv, const std::optional<Tap>& tap, Side side) {
  return tap && tap->side == side ? kv * (1 + tap->position_percent / 100) : kv;
}

struct ZeroSide {
  Winding winding;
  std::optional<Complex> entry;  // 3 Zn where current can enter from the bus
};

// Zero sequence with a zigzag on at least one side: each side for itself.
void write_zigzag(const Transformer& t, const std::array<ZeroSide, 2>& sides, const Star& base, Part part,
                  Circuit& circuit) {
  circuit.group[kZero] = {-1, -1, -1};
  for (int i = 0; i < 2; ++i) {
    if (!sides[i].entry) continue;
    Complex z = *sides[i].entry;
    if (is_zigzag(sides[i].winding)) {
      z += zero_short_circuit_pu(t);
    } else {
      if (!t.zm0_percent) continue;
      z += short_circuit_pu(t) / 2.0 + Complex(0, *t.zm0_percent / 100);
    }
    z = part_of(z, part);
    const double kv = base.winding_kv[i];
    circuit.y_siemens[kZero][i][i] = base.mva / (kv * kv) / z;
    circuit.group[kZero][i] = i;
    circuit.earthed[kZero] = true;
  }
}

}  // namespace

Circuit transformer_circuit(const Transformer& t, Part part) {
  Circuit circuit;
  circuit.terminals = 2;
  circuit.bus = {t.hv_bus, t.lv_bus, {}};
  const ClockedWinding& lower = t.vector_group.lower.front();
  Star star;
  star.mva = t.rated_mva;
  star.winding_kv = {tapped(t.hv_kv, t.tap, Side::hv), tapped(t.lv_kv, t.tap, Side::lv), 1};
  const Complex half = part_of(short_circuit_pu(t), part) / 2.0;
  star.arms = {{half, 0}, {half, 1}};
  write_star(star, kPositive, circuit);
  write_star(star, kNegative, circuit);

  const std::array<ZeroSide, 2> sides{
      ZeroSide{t.vector_group.hv, entry_pu(t.vector_group.hv, t.hv_neutral, t.rated_mva, star.winding_kv[0])},
      ZeroSide{lower.winding, entry_pu(lower.winding, t.lv_neutral, t.rated_mva, star.winding_kv[1])}};
  for (int i = 0; i < 2; ++i) circuit.neutral_earthed[i] = sides[i].entry.has_value();
  if (is_zigzag(sides[0].winding) || is_zigzag(sides[1].winding)) {
    write_zigzag(t, sides, star, part, circuit);
    return circuit;
  }
  star.winding_kv[1] *= zero_sequence_sign(lower);
  circuit.open_kv = star.winding_kv;
  star.arms.clear();
  const Complex half0 = zero_short_circuit_pu(t) / 2.0;
  for (int i = 0; i < 2; ++i) {
    if (sides[i].winding == Winding::delta) star.arms.push_back({part_of(half0, part), -1});
    if (sides[i].entry) star.arms.push_back({part_of(half0 + *sides[i].entry, part), i});
  }
  if (t.zm0_percent) star.arms.push_back({part_of_shunt(Complex(0, *t.zm0_percent / 100), part), -1});
  write_star(star, kZero, circuit);
  return circuit;
}

namespace {

std::array<Complex, 3> star_arms(const ThreeWindingTransformer& t, bool zero) {
  const double mva = t.hv_mv.rated_mva;
  const auto pair = [&](const WindingPair& p) {
    return (zero ? zero_short_circuit_pu(p) : short_circuit_pu(p)) * mva / p.rated_mva;
  };
  const Complex ab = pair(t.hv_mv), ac = pair(t.hv_lv), bc = pair(t.mv_lv);
  return {(ab + ac - bc) / 2.0, (ab + bc - ac) / 2.0, (ac + bc - ab) / 2.0};
}

// Common neutral of an autotransformer: with e = (1, 1, 0) over hv, mv, lv and y_n = 1 / (3 Zn),
// Y' = Y - (Y e)(Y e)^T / (y_n + e^T Y e), in siemens. An open neutral leaves a pure series path between hv
// and mv.
void apply_common_neutral(const ThreeWindingTransformer& t, Part part, Circuit& circuit) {
  auto triple = triple_neutral_ohm(t.hv_neutral);
  if (triple && *triple != Complex(0)) triple = part_of(*triple, part);
  if (triple && *triple == Complex(0)) return;
  auto& y = circuit.y_siemens[kZero];
  const bool through = circuit.earthed[kZero];
  if (!triple && circuit.group[kZero][2] < 0) {
    const Complex sum = y[0][0] + 2.0 * y[0][1] + y[1][1];
    const Complex series = through ? (y[0][0] * y[1][1] - y[0][1] * y[0][1]) / sum : Complex(0);
    y = {};  // a tertiary that zero-sequence current cannot enter has no row here
    y[0] = {series, -series, 0};
    y[1] = {-series, series, 0};
    circuit.open_kv = {1, 1, 1};
    circuit.earthed[kZero] = false;
    circuit.group[kZero] = through ? std::array{0, 0, -1} : std::array{-1, -1, -1};
    return;
  }
  std::array<Complex, 3> ye{};
  for (int i = 0; i < 3; ++i) ye[i] = y[i][0] + y[i][1];
  const Complex d = (triple ? 1.0 / *triple : Complex(0)) + ye[0] + ye[1];
  for (int i = 0; i < 3; ++i)
    for (int j = 0; j < 3; ++j) y[i][j] -= ye[i] * ye[j] / d;
  if (triple) circuit.earthed[kZero] = true;
}

}  // namespace

Circuit three_winding_circuit(const ThreeWindingTransformer& t, Part part) {
  Circuit circuit;
  circuit.terminals = t.lv_bus ? 3 : 2;
  circuit.bus = {t.hv_bus, t.mv_bus, t.lv_bus.value_or(BusIndex{})};
  Star star;
  star.mva = t.hv_mv.rated_mva;
  star.winding_kv = {tapped(t.hv_kv, t.tap, Side::hv), tapped(t.mv_kv, t.tap, Side::mv),
                     tapped(t.lv_kv, t.tap, Side::lv)};
  const auto z = star_arms(t, false);
  for (int i = 0; i < circuit.terminals; ++i) star.arms.push_back({part_of(z[i], part), i});
  write_star(star, kPositive, circuit);
  write_star(star, kNegative, circuit);

  const auto& mv = t.vector_group.lower[0];
  const auto& lv = t.vector_group.lower[1];
  star.winding_kv[1] *= zero_sequence_sign(mv);
  star.winding_kv[2] *= zero_sequence_sign(lv);
  circuit.open_kv = star.winding_kv;
  const std::array<Winding, 3> winding{t.vector_group.hv, mv.winding, lv.winding};
  const std::array<const std::optional<Neutral>*, 3> neutral{&t.hv_neutral, &t.mv_neutral, &t.lv_neutral};
  const auto z0 = star_arms(t, true);
  star.arms.clear();
  for (int i = 0; i < 3; ++i) {
    const bool shares_neutral = t.is_auto() && i < 2;
    const auto entry = shares_neutral ? std::optional<Complex>(0)
                                      : entry_pu(winding[i], *neutral[i], star.mva, star.winding_kv[i]);
    circuit.neutral_earthed[i] =
        shares_neutral ? triple_neutral_ohm(t.hv_neutral).has_value() : entry.has_value();
    if (winding[i] == Winding::delta)
      star.arms.push_back({part_of(z0[i], part), -1});
    else if (entry && i < circuit.terminals)
      star.arms.push_back({part_of(z0[i] + *entry, part), i});
  }
  if (t.zm0_percent) star.arms.push_back({part_of_shunt(Complex(0, *t.zm0_percent / 100), part), -1});
  write_star(star, kZero, circuit);
  circuit.neutral_shared = t.is_auto();
  if (t.is_auto()) apply_common_neutral(t, part, circuit);
  return circuit;
}

}  // namespace kiloamp
