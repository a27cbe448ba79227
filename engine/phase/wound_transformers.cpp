#include <cmath>

#include "engine/phase/element_matrices.hpp"

namespace kiloamp::phase {

namespace {

template <typename Data>
Complex leakage(const Data& d) {
  const double z = d.z_percent / 100;
  double r = 0;
  if (d.x_over_r)
    r = z / std::sqrt(1 + *d.x_over_r * *d.x_over_r);
  else if (d.r_percent)
    r = *d.r_percent / 100;
  else
    r = *d.load_loss_kw * 1e-3 / d.rated_mva;
  return {r, std::sqrt(z * z - r * r)};
}

template <typename Data>
Complex zero_leakage(const Data& d) {
  const Complex z1 = leakage(d);
  const double z0 = d.z0_percent.value_or(d.z_percent) / 100;
  if (!d.r0_percent) return z1 / std::abs(z1) * z0;
  const double r0 = *d.r0_percent / 100;
  return {r0, std::sqrt(z0 * z0 - r0 * r0)};
}

bool zigzag(Winding w) { return w == Winding::zigzag || w == Winding::zigzag_neutral; }

// How far (in 30 degrees) the terminal voltage lags the limb voltage of the same letter. Wirings: delta a-b,
// b-c, c-a; zigzag limb a against limb b.
int lag_of(Winding w) {
  if (w == Winding::delta) return 1;
  return zigzag(w) ? 11 : 0;
}

// Turns the lower winding round the limbs, and reverses it, until it lags the high-voltage terminals by
// `clock`.
void wire(WoundSide& side, Winding hv, int clock) {
  const int base = (12 - lag_of(hv) + lag_of(side.winding)) % 12;
  for (int reversed = 0; reversed < 2; ++reversed)
    for (int turn = 0; turn < 3; ++turn)
      if ((base + 6 * reversed + 4 * turn) % 12 == clock % 12) {
        side.turn = turn;
        side.sign = reversed != 0 ? -1 : 1;
      }
}

void connect(WoundSide& side, Winding winding, const std::optional<Neutral>& neutral) {
  side.winding = winding;
  if (winding == Winding::delta) return;
  side.star = Star::isolated;
  if (!has_neutral(winding) || !neutral || neutral->grounding == Grounding::open) return;
  side.star = Star::earthed;
  if (neutral->grounding == Grounding::impedance)
    side.neutral_ohm = {neutral->r_ohm.value_or(0), neutral->x_ohm.value_or(0)};
}

double with_tap(double kv, const std::optional<Tap>& tap, Side side) {
  return kv * (tap && tap->side == side ? 1 + tap->position_percent / 100 : 1);
}

// Zero-sequence magnetising admittance. Where no winding lets zero-sequence ampere-turns act, the limbs'
// common voltage decides nothing and any value serves.
Complex magnetising(const WoundTransformer& t, const std::optional<double>& zm0_percent) {
  if (zm0_percent) return 1.0 / Complex(0, *zm0_percent / 100);
  for (const WoundSide& side : t.sides)
    if (side.shared_star >= 0 || (!zigzag(side.winding) && side.star != Star::isolated)) return 0;
  return 1;
}

WoundTransformer two_winding(const Transformer& t, std::uint32_t index) {
  WoundTransformer w{{ElementKind::transformer, index}, t.rated_mva, std::vector<WoundSide>(2), 0};
  const Winding windings[] = {t.vector_group.hv, t.vector_group.lower[0].winding};
  const Complex z1 = leakage(t), z0 = zero_leakage(t);
  w.sides[0].bus = t.hv_bus;
  w.sides[1].bus = t.lv_bus;
  w.sides[0].rated_ll_kv = with_tap(t.hv_kv, t.tap, Side::hv);
  w.sides[1].rated_ll_kv = with_tap(t.lv_kv, t.tap, Side::lv);
  connect(w.sides[0], windings[0], t.hv_neutral);
  connect(w.sides[1], windings[1], t.lv_neutral);
  wire(w.sides[1], windings[0], t.vector_group.lower[0].clock);
  const bool any = zigzag(windings[0]) || zigzag(windings[1]);
  for (int i = 0; i < 2; ++i) {
    // A zigzag winding has the leakage z0 of its halves for itself; a star beside it keeps half of the
    // positive-sequence leakage.
    const Complex own0 = zigzag(windings[i]) ? z0 : any ? z1 / 2.0 : z0 / 2.0;
    w.sides[static_cast<std::size_t>(i)].impedance_pu = cyclic(own0, z1 / 2.0, z1 / 2.0);
  }
  w.zero_magnetising_pu = magnetising(w, t.zm0_percent);
  return w;
}

WoundTransformer three_winding(const Network& n, std::uint32_t index) {
  const ThreeWindingTransformer& t = n.three_winding_transformers[index];
  WoundTransformer w{{ElementKind::three_winding_transformer, index}, t.hv_mv.rated_mva, {}, 0};
  const auto arms = [&](auto read) {
    const auto at_base = [&](const WindingPair& p) { return read(p) * (w.mva / p.rated_mva); };
    const Complex ab = at_base(t.hv_mv), ac = at_base(t.hv_lv), bc = at_base(t.mv_lv);
    return std::array<Complex, 3>{0.5 * (ab + ac - bc), 0.5 * (ab + bc - ac), 0.5 * (ac + bc - ab)};
  };
  const auto z1 = arms([](const WindingPair& p) { return leakage(p); });
  const auto z0 = arms([](const WindingPair& p) { return zero_leakage(p); });
  const auto side = [&](std::size_t i, std::optional<BusIndex> bus, double kv, const ClockedWinding& winding,
                        const std::optional<Neutral>& neutral) {
    WoundSide s;
    s.bus = bus;
    s.rated_ll_kv = kv;
    connect(s, winding.winding, neutral);
    if (i > 0) wire(s, t.vector_group.hv, winding.clock);
    s.impedance_pu = cyclic(z0[i], z1[i], z1[i]);
    w.sides.push_back(s);
  };
  side(0, t.hv_bus, with_tap(t.hv_kv, t.tap, Side::hv), {t.vector_group.hv, 0}, t.hv_neutral);
  side(1, t.mv_bus, with_tap(t.mv_kv, t.tap, Side::mv), t.vector_group.lower[0], t.mv_neutral);
  if (t.is_auto()) {
    w.sides[1].star = w.sides[0].star;
    w.sides[1].shared_star = 0;
  }
  const bool loaded = t.lv_bus && n.buses[at(*t.lv_bus)].is_in_service();
  const auto& lower = t.vector_group.lower[1];
  // A tertiary without a bus matters only as a closed delta.
  if (loaded || lower.winding == Winding::delta)
    side(2, loaded ? t.lv_bus : std::nullopt, with_tap(t.lv_kv, t.tap, Side::lv), lower, t.lv_neutral);
  w.zero_magnetising_pu = magnetising(w, t.zm0_percent);
  return w;
}

}  // namespace

std::vector<WoundTransformer> wound_transformers(const Network& n) {
  std::vector<WoundTransformer> all;
  const auto live = [&](const Element& e, BusIndex a, BusIndex b) {
    return e.is_in_service() && n.buses[at(a)].is_in_service() && n.buses[at(b)].is_in_service();
  };
  for (std::uint32_t i = 0; i < n.transformers.size(); ++i)
    if (live(n.transformers[i], n.transformers[i].hv_bus, n.transformers[i].lv_bus))
      all.push_back(two_winding(n.transformers[i], i));
  for (std::uint32_t i = 0; i < n.three_winding_transformers.size(); ++i)
    if (live(n.three_winding_transformers[i], n.three_winding_transformers[i].hv_bus,
             n.three_winding_transformers[i].mv_bus))
      all.push_back(three_winding(n, i));
  return all;
}

}  // namespace kiloamp::phase
