#include "tests/support/random_network.hpp"

#include <cmath>
#include <random>

namespace kiloamp::test {

namespace {

class Maker {
 public:
  explicit Maker(std::uint32_t seed) : random_(seed) {}

  Network make() {
    network_.title = "random network";
    network_.frequency_hz = chance(0.7) ? 50 : 60;
    const int islands = chance(0.25) ? 2 : 1;
    for (int i = 0; i < islands; ++i) island();
    if (chance(0.3)) level(33, 2, false);  // dead buses
    return std::move(network_);
  }

 private:
  // std distributions differ between libraries; these do not.
  double uniform(double low, double high) { return low + (high - low) * (random_() / 4294967296.0); }
  int whole(int low, int high) {
    return low + static_cast<int>(random_() % static_cast<std::uint32_t>(high - low + 1));
  }
  bool chance(double p) { return uniform(0, 1) < p; }
  std::string id(const char* kind) { return std::string(kind) + std::to_string(++count_); }

  std::optional<Neutral> neutral(bool brought_out) {
    if (!brought_out) return std::nullopt;
    const int pick = whole(0, 3);
    if (pick == 0) return Neutral{Grounding::open, {}, {}};
    if (pick == 1)
      return Neutral{Grounding::impedance, uniform(0.1, 20),
                     chance(0.5) ? std::optional(uniform(0.5, 30)) : std::nullopt};
    return Neutral{Grounding::solid, {}, {}};
  }

  // Buses of one voltage, joined by lines and switches. `connected`: with elements between them.
  std::vector<BusIndex> level(double kv, int count, bool connected) {
    std::vector<BusIndex> buses;
    for (int i = 0; i < count; ++i) {
      Bus b;
      b.id = id("B");
      b.nominal_kv = kv;
      if (chance(0.3)) b.prefault_pu = uniform(0.95, 1.08);
      network_.buses.push_back(b);
      buses.push_back(static_cast<BusIndex>(network_.buses.size() - 1));
    }
    for (int i = 1; i < count && connected; ++i)
      join(buses[static_cast<std::size_t>(whole(0, i - 1))], buses[static_cast<std::size_t>(i)]);
    if (connected && count > 2)
      for (int extra = whole(0, 3); extra > 0; --extra) {
        const int a = whole(0, count - 1), b = whole(0, count - 1);
        if (a != b) join(buses[static_cast<std::size_t>(a)], buses[static_cast<std::size_t>(b)]);
      }
    return buses;
  }

  void join(BusIndex a, BusIndex b) {
    const int pick = whole(0, 9);
    if (pick == 0) {
      SeriesReactor r;
      r.id = id("X");
      r.from = a;
      r.to = b;
      r.x_ohm = uniform(0.2, 2);
      r.r_ohm = uniform(0, 0.1);
      network_.series_reactors.push_back(r);
    } else if (pick <= 2) {
      BusSwitch s;
      s.id = id("S");
      s.from = a;
      s.to = b;
      s.closed = chance(0.8);
      network_.switches.push_back(s);
    } else {
      line(a, b);
      if (chance(0.3)) {
        line(a, b);
        couple(network_.lines.size() - 2, network_.lines.size() - 1);
        if (chance(0.3)) {
          line(b, a);
          couple(network_.lines.size() - 3, network_.lines.size() - 1);
          couple(network_.lines.size() - 2, network_.lines.size() - 1);
        }
        if (chance(0.2)) {
          network_.lines.back().in_service = false;
          network_.lines.back().earthed_when_out = chance(0.7);
        }
      }
    }
  }

  void line(BusIndex a, BusIndex b) {
    Line l;
    l.id = id("L");
    l.from = a;
    l.to = b;
    l.kind = chance(0.5) ? LineKind::overhead : LineKind::cable;
    l.length_km = uniform(0.3, 25);
    l.x1_ohm_per_km = uniform(0.1, 0.45);
    l.r1_ohm_per_km = l.x1_ohm_per_km * uniform(0.05, 1.0);
    l.x0_ohm_per_km = l.x1_ohm_per_km * uniform(1.5, 4);
    l.r0_ohm_per_km = *l.x0_ohm_per_km * uniform(0.05, 0.6);
    if (chance(0.4)) l.b0_us_per_km = uniform(0.5, 90);
    if (chance(0.3)) l.b1_us_per_km = uniform(2, 100);
    network_.lines.push_back(l);
  }

  void couple(std::size_t a, std::size_t b) {
    const Line &first = network_.lines[a], &second = network_.lines[b];
    MutualCoupling c;
    c.id = id("M");
    c.line_a = static_cast<std::uint32_t>(a);
    c.line_b = static_cast<std::uint32_t>(b);
    c.length_km = std::min(first.length_km, second.length_km) * uniform(0.3, 1);
    c.x0m_ohm_per_km = std::min(*first.x0_ohm_per_km, *second.x0_ohm_per_km) * uniform(0.1, 0.45);
    c.r0m_ohm_per_km = std::min(*first.r0_ohm_per_km, *second.r0_ohm_per_km) * uniform(0, 0.45);
    c.orientation = first.from == second.from ? 1 : -1;
    network_.mutual_couplings.push_back(c);
  }

  void source(BusIndex bus) {
    const double kv = network_.bus(bus).nominal_kv;
    if (chance(0.5)) {
      NetworkFeeder f;
      f.id = id("Q");
      f.bus = bus;
      f.max.three_phase_ka = uniform(3, 40);
      f.max.x_over_r = uniform(3, 30);
      if (chance(0.4)) {
        f.max.line_to_ground_ka = *f.max.three_phase_ka * uniform(0.2, 1.15);
        f.max.x0_over_r0 = uniform(2, 20);
      } else if (chance(0.5)) {
        f.max.x0_over_x1 = uniform(0.5, 4);
        f.max.r0_over_x0 = uniform(0, 0.4);
      }
      network_.network_feeders.push_back(f);
      return;
    }
    SynchronousMachine m;
    m.id = id("G");
    m.bus = bus;
    m.role = static_cast<MachineRole>(whole(0, 2));
    m.rated_mva = uniform(5, 200);
    m.rated_kv = kv * uniform(0.95, 1.05);
    m.xd_subtransient_percent = uniform(10, 25);
    m.x2_percent = m.xd_subtransient_percent * uniform(0.9, 1.4);
    m.x0_percent = uniform(2, 10);
    m.ra_percent = uniform(0.1, 1);
    m.neutral = neutral(true);
    network_.synchronous_machines.push_back(m);
  }

  void motor(BusIndex bus) {
    InductionMotor m;
    m.id = id("A");
    m.bus = bus;
    m.count = whole(1, 5);
    m.rated_kw = uniform(50, 2000);
    m.rated_kv = network_.bus(bus).nominal_kv;
    m.power_factor = uniform(0.8, 0.92);
    m.efficiency_percent = uniform(92, 97);
    m.locked_rotor_ratio = uniform(4, 7);
    m.r_over_x = uniform(0.1, 0.42);
    network_.induction_motors.push_back(m);
  }

  static const char* letters(int which, bool hv) {
    static const char* upper[] = {"D", "Y", "YN", "Z", "ZN"};
    static const char* lower[] = {"d", "y", "yn", "z", "zn"};
    return hv ? upper[which] : lower[which];
  }
  static bool star(int which) { return which == 1 || which == 2; }
  int clock(int hv, int lower) { return 2 * whole(0, 5) + (star(hv) != star(lower) ? 1 : 0); }

  void two_winding(BusIndex hv, BusIndex lv) {
    const int a = whole(0, 4), b = whole(0, 4);
    const std::string group = letters(a, true) + std::string(letters(b, false)) + std::to_string(clock(a, b));
    for (int unit = chance(0.3) ? 2 : 1; unit > 0; --unit) {
      Transformer t;
      t.id = id("T");
      t.hv_bus = hv;
      t.lv_bus = lv;
      t.rated_mva = uniform(5, 100);
      t.hv_kv = network_.bus(hv).nominal_kv * uniform(0.97, 1.05);
      t.lv_kv = network_.bus(lv).nominal_kv * uniform(1.0, 1.08);
      t.z_percent = uniform(6, 16);
      t.x_over_r = uniform(8, 40);
      t.vector_group = *parse_vector_group(group);
      t.z0_percent =
          *(chance(0.7) ? std::optional(t.z_percent * uniform(0.8, 1.1)) : std::optional(t.z_percent));
      if (chance(0.4)) t.r0_percent = *t.z0_percent * uniform(0.02, 0.1);
      if (chance(0.4)) t.zm0_percent = uniform(40, 200);
      t.hv_neutral = neutral(has_neutral(t.vector_group.hv));
      t.lv_neutral = neutral(has_neutral(t.vector_group.lower[0].winding));
      if (chance(0.4)) t.tap = Tap{chance(0.5) ? Side::hv : Side::lv, uniform(-10, 10)};
      network_.transformers.push_back(t);
    }
  }

  void three_winding(BusIndex hv, BusIndex mv, std::optional<BusIndex> lv) {
    ThreeWindingTransformer t;
    t.id = id("W");
    t.hv_bus = hv;
    t.mv_bus = mv;
    t.lv_bus = lv;
    t.hv_kv = network_.bus(hv).nominal_kv * uniform(0.98, 1.05);
    t.mv_kv = network_.bus(mv).nominal_kv * uniform(1.0, 1.05);
    t.lv_kv = lv ? network_.bus(*lv).nominal_kv : 10;
    const auto pair = [&](double mva, double z) {
      WindingPair p;
      p.rated_mva = mva;
      p.z_percent = z;
      p.r_percent = z * uniform(0.01, 0.06);
      p.z0_percent = z * uniform(0.9, 1.1);
      return p;
    };
    t.hv_mv = pair(uniform(60, 200), uniform(10, 20));
    t.hv_lv = pair(uniform(20, 60), uniform(8, 14));
    t.mv_lv = pair(uniform(20, 60), uniform(5, 9));
    t.autotransformer = chance(0.3) ? std::optional(true) : std::nullopt;
    const int a = t.is_auto() ? 2 : whole(0, 2), b = t.is_auto() ? 2 : whole(0, 2),
              c = t.is_auto() ? whole(0, 1) : whole(0, 2);
    t.vector_group = *parse_vector_group(letters(a, true) + std::string(letters(b, false)) +
                                         std::to_string(t.is_auto() ? 0 : clock(a, b)) + letters(c, false) +
                                         std::to_string(clock(a, c)));
    t.hv_neutral = neutral(has_neutral(t.vector_group.hv));
    if (!t.is_auto()) t.mv_neutral = neutral(has_neutral(t.vector_group.lower[0].winding));
    t.lv_neutral = neutral(has_neutral(t.vector_group.lower[1].winding));
    if (chance(0.3)) t.zm0_percent = uniform(50, 200);
    if (chance(0.3)) t.tap = Tap{static_cast<Side>(whole(0, 2)), uniform(-8, 8)};
    network_.three_winding_transformers.push_back(t);
  }

  void extras(const std::vector<BusIndex>& buses) {
    const auto any = [&] {
      return buses[static_cast<std::size_t>(whole(0, static_cast<int>(buses.size()) - 1))];
    };
    if (chance(0.3)) {
      EarthingTransformer e;
      e.id = id("E");
      e.bus = any();
      e.r0_ohm = uniform(0, 2);
      e.x0_ohm = uniform(2, 30);
      e.neutral = neutral(true);
      network_.earthing_transformers.push_back(e);
    }
    if (chance(0.3)) {
      Shunt s;
      s.id = id("C");
      s.bus = any();
      s.mvar = uniform(-5, 10);
      s.rated_kv = network_.bus(s.bus).nominal_kv;
      s.grounded = chance(0.5);
      network_.shunts.push_back(s);
    }
    for (int n = whole(0, 2); n > 0; --n) motor(any());
    if (chance(0.4)) source(any());
  }

  void island() {
    const auto high = level(110, whole(1, 5), true);
    const auto low = level(20, whole(1, 6), true);
    source(high[0]);
    const auto any = [&](const std::vector<BusIndex>& buses) {
      return buses[static_cast<std::size_t>(whole(0, static_cast<int>(buses.size()) - 1))];
    };
    if (chance(0.3)) {
      const auto third = level(10, whole(1, 2), true);
      three_winding(any(high), any(low), chance(0.6) ? std::optional(third[0]) : std::nullopt);
      extras(third);
    } else {
      two_winding(any(high), any(low));
    }
    if (chance(0.5)) {
      const auto end = level(6, whole(1, 3), true);
      two_winding(any(low), any(end));
      extras(end);
    }
    extras(high);
    extras(low);
  }

  std::mt19937 random_;
  Network network_;
  int count_ = 0;
};

}  // namespace

Network random_network(std::uint32_t seed) { return Maker(seed).make(); }

}  // namespace kiloamp::test
