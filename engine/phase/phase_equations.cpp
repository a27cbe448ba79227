#include "engine/phase/phase_equations.hpp"

#include <cmath>
#include <numeric>

namespace kiloamp::phase {

namespace {

constexpr double kRatioTolerance = 1e-9;
double winding_kv(const WoundSide& s) {
  return s.winding == Winding::delta ? s.rated_ll_kv : s.rated_ll_kv / std::sqrt(3.0);
}
bool zigzag(const WoundSide& s) {
  return s.winding == Winding::zigzag || s.winding == Winding::zigzag_neutral;
}

// Which limbs a winding on limb `limb` embraces, and with what weight.
std::array<std::pair<int, double>, 2> limbs_of(const WoundSide& s, int limb) {
  if (!zigzag(s)) return {std::pair{limb, 1.0}, std::pair{limb, 0.0}};
  return {std::pair{limb, 1 / std::sqrt(3.0)}, std::pair{(limb + 1) % 3, -1 / std::sqrt(3.0)}};
}

}  // namespace

// Sets of nodes; each node keeps the ratio of its voltage to its set's first node when no current flows.
struct PhaseEquations::Sets {
  explicit Sets(int nodes)
      : set(static_cast<std::size_t>(nodes)), ratio(set.size(), 1.0), tied(set.size(), false) {
    std::iota(set.begin(), set.end(), 0);
  }
  std::vector<int> set;
  std::vector<double> ratio;
  std::vector<bool> tied;  // by set number

  void join(int a, int b, double b_over_a) {
    const int keep = set[static_cast<std::size_t>(a)], drop = set[static_cast<std::size_t>(b)];
    const double want = ratio[static_cast<std::size_t>(a)] * b_over_a;
    if (keep == drop) {
      if (std::abs(ratio[static_cast<std::size_t>(b)] / want - 1) > kRatioTolerance)
        tied[static_cast<std::size_t>(keep)] = true;
      return;
    }
    const double scale = want / ratio[static_cast<std::size_t>(b)];
    for (std::size_t n = 0; n < set.size(); ++n)
      if (set[n] == drop) {
        set[n] = keep;
        ratio[n] *= scale;
      }
    if (tied[static_cast<std::size_t>(drop)]) tied[static_cast<std::size_t>(keep)] = true;
  }
  void tie(int a) { tied[static_cast<std::size_t>(set[static_cast<std::size_t>(a)])] = true; }
};

PhaseEquations::PhaseEquations(const Network& network, bool include_shunts)
    : shunts_(shunt_elements(network, include_shunts)),
      branches_(branch_elements(network, include_shunts)),
      transformers_(wound_transformers(network)) {
  number_nodes(network);
  number_transformers();
  Sets zero(nodes_), positive(nodes_);
  join_sections(zero, positive);
  assemble(zero, positive);
}

void PhaseEquations::number_nodes(const Network& network) {
  // Spread each bus over the closed switches that reach it.
  node_of_bus_.assign(network.buses.size(), -1);
  std::vector<std::vector<std::size_t>> over(network.buses.size());
  for (const BusSwitch& s : network.switches) {
    if (!s.closed || !s.is_in_service() || !network.buses[at(s.from)].is_in_service() ||
        !network.buses[at(s.to)].is_in_service())
      continue;
    over[at(s.from)].push_back(at(s.to));
    over[at(s.to)].push_back(at(s.from));
  }
  for (std::size_t b = 0; b < network.buses.size(); ++b) {
    if (node_of_bus_[b] >= 0 || !network.buses[b].is_in_service()) continue;
    std::vector<std::size_t> reached{b};
    node_of_bus_[b] = nodes_;
    while (!reached.empty()) {
      const std::size_t here = reached.back();
      reached.pop_back();
      for (const std::size_t next : over[here]) {
        if (node_of_bus_[next] >= 0) continue;
        node_of_bus_[next] = nodes_;
        reached.push_back(next);
      }
    }
    ++nodes_;
  }
}

void PhaseEquations::number_transformers() {
  unknowns_ = 3 * nodes_;
  for (const WoundTransformer& t : transformers_) {
    WoundPlace place;
    place.limbs = unknowns_;
    unknowns_ += 3;
    for (const WoundSide& s : t.sides) {
      place.ampere_turns.push_back(unknowns_);
      unknowns_ += s.bus ? 3 : 1;
      const bool floats =
          s.star == Star::isolated || (s.star == Star::earthed && s.neutral_ohm != Complex(0));
      if (s.shared_star >= 0) {
        place.star.push_back(place.star[static_cast<std::size_t>(s.shared_star)]);
      } else {
        place.star.push_back(floats ? unknowns_ : -1);
        if (floats) ++unknowns_;
      }
    }
    places_.push_back(place);
  }
}

void PhaseEquations::join_sections(Sets& zero, Sets& positive) const {
  for (const ShuntElement& s : shunts_) {
    if (s.ties_to_earth) zero.tie(node(s.bus));
    if (s.is_source) positive.tie(node(s.bus));
  }
  for (const BranchElement& b : branches_)
    for (std::size_t k = 0; k < b.charged.size(); ++k) {
      const int from = node(b.ends[2 * k].bus), to = node(b.ends[2 * k + 1].bus);
      zero.join(from, to, 1);
      positive.join(from, to, 1);
      if (b.charged[k]) zero.tie(from);
    }
  for (const WoundTransformer& t : transformers_) {
    bool closes = false, has_zigzag = false;
    for (const WoundSide& s : t.sides) {
      closes = closes || s.winding == Winding::delta;
      has_zigzag = has_zigzag || zigzag(s);
    }
    const bool magnetises = t.zero_magnetising_pu != Complex(0);
    closes = (closes && !has_zigzag) || magnetises;
    const WoundSide* first = nullptr;
    for (const WoundSide& s : t.sides) {
      if (!s.bus) continue;
      positive.join(node(*t.sides[0].bus), node(*s.bus), 1);
      if (zigzag(s)) {
        if (s.star == Star::earthed) zero.tie(node(*s.bus));
        continue;
      }
      if (s.star != Star::earthed) continue;
      if (closes) zero.tie(node(*s.bus));
      if (first != nullptr && !has_zigzag)
        zero.join(node(*first->bus), node(*s.bus),
                  winding_kv(s) * s.sign / (winding_kv(*first) * first->sign));
      if (first == nullptr) first = &s;
    }
    const bool open_auto =
        t.sides.size() > 1 && t.sides[1].shared_star == 0 && t.sides[0].star == Star::isolated;
    if (open_auto && closes) zero.join(node(*t.sides[0].bus), node(*t.sides[1].bus), 1);
  }
  // Ratios of positive-sequence voltages play no part: only sources tie.
  for (std::size_t n = 0; n < positive.ratio.size(); ++n) positive.ratio[n] = 1;
}

void PhaseEquations::stamp_transformer(std::size_t index,
                                       std::vector<Eigen::Triplet<Complex>>& entries) const {
  const WoundTransformer& t = transformers_[index];
  const WoundPlace& place = places_[index];
  const Matrix3 magnetising = cyclic(t.zero_magnetising_pu, 0, 0);
  for (int m = 0; m < 3; ++m)
    for (int q = 0; q < 3; ++q) entries.emplace_back(place.limbs + m, place.limbs + q, -magnetising(m, q));
  for (std::size_t k = 0; k < t.sides.size(); ++k) {
    const WoundSide& s = t.sides[k];
    const Eigen::Index j = place.ampere_turns[k];
    if (!s.bus) {  // a buried delta: one current round its three windings
      Complex z0 = 0;
      for (int q = 0; q < 3; ++q) z0 += s.impedance_pu(0, q);
      entries.emplace_back(j, j, 3.0 * z0);
      for (int m = 0; m < 3; ++m) {
        entries.emplace_back(j, place.limbs + m, 1.0);
        entries.emplace_back(place.limbs + m, j, 1.0);
      }
      continue;
    }
    const double kv = winding_kv(s), ka = t.mva / 3 / kv;
    for (int terminal = 0; terminal < 3; ++terminal) {
      const int limb = (terminal + s.turn) % 3;
      const Eigen::Index equation = j + limb, start = row(*s.bus, terminal);
      const Eigen::Index finish =
          s.winding == Winding::delta ? row(*s.bus, (terminal + 1) % 3) : place.star[k];
      entries.emplace_back(equation, start, s.sign / kv);
      entries.emplace_back(start, equation, s.sign * ka);
      if (finish >= 0) {
        entries.emplace_back(equation, finish, -s.sign / kv);
        entries.emplace_back(finish, equation, -s.sign * ka);
      }
      for (const auto& [m, weight] : limbs_of(s, limb)) {
        entries.emplace_back(equation, place.limbs + m, -weight);
        entries.emplace_back(place.limbs + m, equation, weight);
      }
      for (int q = 0; q < 3; ++q) entries.emplace_back(equation, j + q, -s.impedance_pu(limb, q));
    }
    if (place.star[k] >= 0 && s.shared_star < 0 && s.star == Star::earthed)
      entries.emplace_back(place.star[k], place.star[k], 1.0 / s.neutral_ohm);
  }
}

void PhaseEquations::assemble(const Sets& zero, const Sets& positive) {
  std::vector<Eigen::Triplet<Complex>> entries;
  const auto add = [&](Eigen::Index row, Eigen::Index column, const Matrix3& y) {
    for (int p = 0; p < 3; ++p)
      for (int q = 0; q < 3; ++q) entries.emplace_back(row + p, column + q, y(p, q));
  };
  for (const ShuntElement& s : shunts_) add(row(s.bus, 0), row(s.bus, 0), s.admittance);
  for (const BranchElement& b : branches_)
    for (std::size_t i = 0; i < b.ends.size(); ++i)
      for (std::size_t k = 0; k < b.ends.size(); ++k)
        add(row(b.ends[i].bus, 0), row(b.ends[k].bus, 0),
            b.admittance.block<3, 3>(static_cast<Eigen::Index>(3 * i), static_cast<Eigen::Index>(3 * k)));
  for (std::size_t t = 0; t < transformers_.size(); ++t) stamp_transformer(t, entries);
  pin_of_node_.assign(static_cast<std::size_t>(nodes_), -1);
  std::vector<int> pin_of_set(static_cast<std::size_t>(nodes_), -1);
  for (int n = 0; n < nodes_; ++n) {
    const auto zero_set = static_cast<std::size_t>(zero.set[static_cast<std::size_t>(n)]);
    if (!zero.tied[zero_set]) {
      if (pin_of_set[zero_set] < 0) {
        pin_of_set[zero_set] = n;
        add(3 * n, 3 * n, cyclic(kPin_siemens, 0, 0));
      }
      pin_of_node_[static_cast<std::size_t>(n)] = pin_of_set[zero_set];
    }
    const auto positive_set = static_cast<std::size_t>(positive.set[static_cast<std::size_t>(n)]);
    if (!positive.tied[positive_set] && static_cast<int>(positive_set) == n)
      add(3 * n, 3 * n, cyclic(0, kPin_siemens, kPin_siemens));
  }
  matrix_.resize(unknowns_, unknowns_);
  matrix_.setFromTriplets(entries.begin(), entries.end());
}

int PhaseEquations::pin_of(BusIndex bus) const { return pin_of_node_[static_cast<std::size_t>(node(bus))]; }

Phases PhaseEquations::terminal_current(std::size_t index, std::size_t side,
                                        const Eigen::VectorXcd& x) const {
  const WoundTransformer& t = transformers_[index];
  const WoundSide& s = t.sides[side];
  const double ka = t.mva / 3 / winding_kv(s);
  Phases into_winding{};
  for (int terminal = 0; terminal < 3; ++terminal) {
    const Complex current = s.sign * ka * x[places_[index].ampere_turns[side] + (terminal + s.turn) % 3];
    into_winding[static_cast<std::size_t>(terminal)] += current;
    if (s.winding == Winding::delta) into_winding[static_cast<std::size_t>((terminal + 1) % 3)] -= current;
  }
  return into_winding;
}

std::vector<PhaseContribution> PhaseEquations::currents_into(BusIndex bus, const Eigen::VectorXcd& x) const {
  std::vector<PhaseContribution> found;
  const auto add = [&](ElementRef element, const Phases& into_element) {
    found.push_back({element, bus, {-into_element[0], -into_element[1], -into_element[2]}});
  };
  const auto voltages = [&](BusIndex b) -> Eigen::Vector3cd { return x.segment<3>(row(b, 0)); };
  const auto phases = [](const Eigen::Vector3cd& v) { return Phases{v[0], v[1], v[2]}; };
  for (const ShuntElement& s : shunts_)
    if (s.bus == bus) add(s.element, phases(s.admittance * voltages(bus)));
  for (const BranchElement& b : branches_)
    for (std::size_t i = 0; i < b.ends.size(); ++i) {
      if (b.ends[i].bus != bus) continue;
      Eigen::Vector3cd current = Eigen::Vector3cd::Zero();
      for (std::size_t k = 0; k < b.ends.size(); ++k)
        current +=
            b.admittance.block<3, 3>(static_cast<Eigen::Index>(3 * i), static_cast<Eigen::Index>(3 * k)) *
            voltages(b.ends[k].bus);
      add(b.ends[i].element, phases(current));
    }
  for (std::size_t t = 0; t < transformers_.size(); ++t)
    for (std::size_t side = 0; side < transformers_[t].sides.size(); ++side)
      if (transformers_[t].sides[side].bus == bus)
        add(transformers_[t].element, terminal_current(t, side, x));
  return found;
}

}  // namespace kiloamp::phase
