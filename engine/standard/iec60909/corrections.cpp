#include "engine/standard/iec60909/corrections.hpp"

#include <algorithm>
#include <cmath>

#include "engine/network/feeder_level.hpp"

namespace kiloamp::iec60909 {

namespace {

constexpr double kDefaultTolerance = 10;  // percent; IEC 60038 (from memory)

double sine_of(double cosine) { return std::sqrt(std::max(0.0, 1 - cosine * cosine)); }

// x_T in per unit of the rating, from z_percent and one way of saying the resistance.
template <typename Data>
double reactance_pu(const Data& d) {
  const double z = d.z_percent / 100;
  if (d.x_over_r) return z * std::sin(std::atan(*d.x_over_r));
  const double r = d.r_percent ? *d.r_percent / 100 : d.load_loss_kw.value_or(0) / 1000 / d.rated_mva;
  return std::sqrt(std::max(0.0, z * z - r * r));
}

class Collector {
 public:
  Collector(const Network& network, CaseKind kind, Edition edition, std::optional<std::uint32_t> inside,
            std::vector<Finding>& missing)
      : n_(network), kind_(kind), edition_(edition), inside_(inside), missing_(missing) {}

  std::vector<Correction> run() {
    feeders();
    if (kind_ == CaseKind::min && edition_ == Edition::e2016) return std::move(list_);
    units();
    machines();
    transformers();
    three_windings();
    return std::move(list_);
  }

 private:
  double c_max_at(BusIndex bus) const {
    return c_max(n_.bus(bus).nominal_kv, n_.bus(bus).voltage_tolerance_percent.value_or(kDefaultTolerance));
  }
  std::optional<double> sin_phi(std::uint32_t machine) {
    const SynchronousMachine& m = n_.synchronous_machines[machine];
    if (m.power_factor) return sine_of(*m.power_factor);
    missing_.push_back({Severity::error, ElementRef{ElementKind::synchronous_machine, machine},
                        "power_factor", "missing",
                        "IEC 60909-0 needs it for the correction factor of the machine",
                        "give the rated power factor of the nameplate"});
    return std::nullopt;
  }

  void feeders() {
    for (std::uint32_t i = 0; i < n_.network_feeders.size(); ++i) {
      const NetworkFeeder& f = n_.network_feeders[i];
      const FeederLevel& level = level_in_use(n_, f);
      if (!is_live(n_, f, f.bus) || level.is_outright() || level.voltage_factor) continue;
      list_.push_back(
          {{ElementKind::network_feeder, i}, 0, "c", voltage_factor(n_.bus(f.bus), kind_, edition_)});
    }
  }

  void units() {
    in_unit_machine_.resize(n_.synchronous_machines.size());
    in_unit_transformer_.resize(n_.transformers.size());
    for (std::uint32_t i = 0; i < n_.power_station_units.size(); ++i) {
      const PowerStationUnit& u = n_.power_station_units[i];
      const SynchronousMachine& m = n_.synchronous_machines[u.machine];
      const Transformer& t = n_.transformers[u.transformer];
      if (!u.is_in_service() || !is_live(n_, m, m.bus) || !is_live(n_, t, t.hv_bus, t.lv_bus)) continue;
      in_unit_machine_[u.machine] = in_unit_transformer_[u.transformer] = true;
      const auto sine = sin_phi(u.machine);
      if (!sine) continue;
      UnitData d;
      d.unq_kv = n_.bus(t.hv_bus).nominal_kv;
      d.urg_kv = m.rated_kv;
      d.urthv_kv = t.hv_kv;
      d.urtlv_kv = t.lv_kv;
      d.xd_pu = m.xd_subtransient_percent / 100;
      d.xt_pu = reactance_pu(t);
      d.sin_phi = *sine;
      d.pg = m.voltage_range_percent.value_or(0) / 100;
      d.c_max = c_max_at(t.hv_bus);
      const bool on_load = t.on_load_tap_changer.value_or(false);
      if (!on_load) d.pt = -t.tap_range_percent.value_or(0) / 100;  // the smaller factor: the larger current
      const ElementRef machine{ElementKind::synchronous_machine, u.machine},
          transformer{ElementKind::transformer, u.transformer};
      if (inside_ == i) {
        d.c_max = c_max_at(m.bus);
        const InsideUnit k = inside_unit(d, on_load);
        list_.push_back({machine, 0, on_load ? "K_G,S" : "K_G,SO", k.generator});
        list_.push_back({transformer, 0, on_load ? "K_T,S" : "K_T,SO", k.transformer});
        continue;
      }
      const double k = on_load ? k_s(d) : k_so(d);
      list_.push_back({machine, 0, on_load ? "K_S" : "K_SO", k});
      list_.push_back({transformer, 0, on_load ? "K_S" : "K_SO", k});
    }
  }

  void machines() {
    for (std::uint32_t i = 0; i < n_.synchronous_machines.size(); ++i) {
      const SynchronousMachine& m = n_.synchronous_machines[i];
      if (in_unit_machine_[i] || !is_live(n_, m, m.bus)) continue;
      const auto sine = sin_phi(i);
      if (!sine) continue;
      list_.push_back({{ElementKind::synchronous_machine, i},
                       0,
                       "K_G",
                       k_g(n_.bus(m.bus).nominal_kv, m.rated_kv, m.voltage_range_percent.value_or(0) / 100,
                           c_max_at(m.bus), m.xd_subtransient_percent / 100, *sine)});
    }
  }

  void transformers() {
    for (std::uint32_t i = 0; i < n_.transformers.size(); ++i) {
      const Transformer& t = n_.transformers[i];
      if (in_unit_transformer_[i] || !is_live(n_, t, t.hv_bus, t.lv_bus)) continue;
      const double c = c_max_at(t.lv_bus), x = reactance_pu(t);
      double k = k_t(c, x);
      if (t.worst_load) {
        const double ir_a = 1000 * t.rated_mva / (std::sqrt(3.0) * t.lv_kv);
        k = k_t_known_load(c, x,
                           {n_.bus(t.lv_bus).nominal_kv / t.worst_load->voltage_kv,
                            t.worst_load->current_a / ir_a, sine_of(t.worst_load->power_factor)});
      }
      list_.push_back({{ElementKind::transformer, i}, 0, "K_T", k});
    }
  }

  void three_windings() {
    for (std::uint32_t i = 0; i < n_.three_winding_transformers.size(); ++i) {
      const ThreeWindingTransformer& t = n_.three_winding_transformers[i];
      if (!is_live(n_, t, t.hv_bus, t.mv_bus)) continue;
      const double c_mv = c_max_at(t.mv_bus);
      const double c_lv = t.lv_bus ? c_max_at(*t.lv_bus) : c_max(t.lv_kv, kDefaultTolerance);
      const WindingPair* pairs[] = {&t.hv_mv, &t.hv_lv, &t.mv_lv};
      const double c[] = {c_mv, c_lv, c_lv};
      for (int p = 0; p < 3; ++p)
        list_.push_back(
            {{ElementKind::three_winding_transformer, i}, p, "K_T", k_t(c[p], reactance_pu(*pairs[p]))});
    }
  }

  const Network& n_;
  CaseKind kind_;
  Edition edition_;
  std::optional<std::uint32_t> inside_;
  std::vector<Finding>& missing_;
  std::vector<Correction> list_;
  std::vector<bool> in_unit_machine_, in_unit_transformer_;
};

void times(std::optional<double>& value, double factor) {
  if (value) *value *= factor;
}

// Short-circuit data times a factor; zero_too: what is said of zero sequence as well.
template <typename Data>
void scale_short_circuit(Data& d, double factor) {
  d.z_percent *= factor;
  times(d.r_percent, factor);
  times(d.load_loss_kw, factor);
  times(d.z0_percent, factor);
  times(d.r0_percent, factor);
}

void scale_outright(FeederLevel& level, const SequenceImpedances& z, double r_factor, double x_factor) {
  FeederLevel outright;
  const auto set = [&](std::optional<double>& r, std::optional<double>& x, const auto& value) {
    if (!value) return;
    r = value->real() * r_factor;
    x = value->imag() * x_factor;
  };
  set(outright.r1_ohm, outright.x1_ohm, z[1]);
  set(outright.r2_ohm, outright.x2_ohm, z[2]);
  set(outright.r0_ohm, outright.x0_ohm, z[0]);
  level = outright;
}

FeederLevel& level_of(const Network& network, NetworkFeeder& feeder) {
  return &level_in_use(network, feeder) == &feeder.max ? feeder.max : *feeder.min;
}

// Positive sequence at another frequency: R stays, X times ratio.
template <typename Data>
void shift_short_circuit(Data& d, double ratio) {
  const double x = reactance_pu(d) * 100, r = std::sqrt(std::max(0.0, d.z_percent * d.z_percent - x * x));
  d.x_over_r.reset();
  d.load_loss_kw.reset();
  d.r_percent = r;
  d.z_percent = std::hypot(r, ratio * x);
}

}  // namespace

double voltage_factor(const Bus& bus, CaseKind kind, Edition edition) {
  const double tolerance = bus.voltage_tolerance_percent.value_or(kDefaultTolerance);
  return kind == CaseKind::max ? c_max(bus.nominal_kv, tolerance) : c_min(bus.nominal_kv, tolerance, edition);
}

std::vector<Correction> corrections(const Network& network, CaseKind kind, Edition edition,
                                    std::optional<std::uint32_t> inside, std::vector<Finding>& missing) {
  return Collector(network, kind, edition, inside, missing).run();
}

void apply(const std::vector<Correction>& corrections, Network& network) {
  for (Transformer& t : network.transformers) t.tap.reset();
  for (ThreeWindingTransformer& t : network.three_winding_transformers) t.tap.reset();
  for (const Correction& c : corrections) {
    const auto i = c.element.index;
    switch (c.element.kind) {
      case ElementKind::network_feeder:
        level_of(network, network.network_feeders[i]).voltage_factor = c.factor;
        break;
      case ElementKind::synchronous_machine: {
        SynchronousMachine& m = network.synchronous_machines[i];
        m.xd_subtransient_percent *= c.factor;
        times(m.ra_percent, c.factor);
        times(m.x2_percent, c.factor);
        times(m.x0_percent, c.factor);
        break;
      }
      case ElementKind::transformer:
        scale_short_circuit(network.transformers[i], c.factor);
        times(network.transformers[i].zm0_percent, c.factor);
        break;
      case ElementKind::three_winding_transformer: {
        ThreeWindingTransformer& t = network.three_winding_transformers[i];
        scale_short_circuit(c.part == 0 ? t.hv_mv : c.part == 1 ? t.hv_lv : t.mv_lv, c.factor);
        if (c.part == 0) times(t.zm0_percent, c.factor);
        break;
      }
      default:
        break;
    }
  }
}

std::optional<std::complex<double>> corrected_ohm(const Network& n, const Correction& c) {
  const auto i = c.element.index;
  const auto of_pair = [](const auto& d, double kv) {
    const double x = reactance_pu(d), z = d.z_percent / 100;
    return std::complex<double>(std::sqrt(std::max(0.0, z * z - x * x)), x) * (kv * kv / d.rated_mva);
  };
  switch (c.element.kind) {
    case ElementKind::network_feeder: {
      const NetworkFeeder& f = n.network_feeders[i];
      const auto z = feeder_impedance_ohm(level_in_use(n, f), n.bus(f.bus).nominal_kv);
      return z ? (*z)[1] : std::nullopt;
    }
    case ElementKind::synchronous_machine: {
      const SynchronousMachine& m = n.synchronous_machines[i];
      const double r = m.ra_percent ? *m.ra_percent : m.xd_subtransient_percent / *m.x_over_r;
      return std::complex<double>(r, m.xd_subtransient_percent) / 100.0 *
             (m.rated_kv * m.rated_kv / m.rated_mva);
    }
    case ElementKind::transformer:
      return of_pair(n.transformers[i], n.transformers[i].hv_kv);
    case ElementKind::three_winding_transformer: {
      const ThreeWindingTransformer& t = n.three_winding_transformers[i];
      return c.part == 0   ? of_pair(t.hv_mv, t.hv_kv)
             : c.part == 1 ? of_pair(t.hv_lv, t.hv_kv)
                           : of_pair(t.mv_lv, t.mv_kv);
    }
    default:
      return std::nullopt;
  }
}

Network at_frequency(const Network& corrected, double ratio, bool fictitious_resistance) {
  Network n = corrected;
  for (NetworkFeeder& f : n.network_feeders) {
    FeederLevel& level = level_of(n, f);
    if (const auto z = feeder_impedance_ohm(level, n.bus(f.bus).nominal_kv))
      scale_outright(level, *z, 1, ratio);
  }
  for (SynchronousMachine& m : n.synchronous_machines) {
    double r = m.ra_percent ? *m.ra_percent : m.xd_subtransient_percent / *m.x_over_r;
    if (fictitious_resistance) r = fictitious_r_over_xd(m.rated_kv, m.rated_mva) * m.xd_subtransient_percent;
    m.x_over_r.reset();
    m.ra_percent = r;
    m.xd_subtransient_percent *= ratio;
    times(m.x2_percent, ratio);
  }
  for (InductionMotor& m : n.induction_motors) {
    const double rx = m.r_over_x.value_or(0);
    *m.locked_rotor_ratio *= std::hypot(rx, 1.0) / std::hypot(rx, ratio);
    m.r_over_x = rx / ratio;
  }
  for (InverterSource& s : n.inverter_sources) {
    if (!s.doubly_fed) continue;
    DoublyFed& d = *s.doubly_fed;
    d.peak_ka *= std::hypot(d.r_over_x, 1.0) / std::hypot(d.r_over_x, ratio);
    d.r_over_x /= ratio;
  }
  for (Line& line : n.lines) line.x1_ohm_per_km *= ratio;
  for (Transformer& t : n.transformers) shift_short_circuit(t, ratio);
  for (ThreeWindingTransformer& t : n.three_winding_transformers)
    for (WindingPair* pair : {&t.hv_mv, &t.hv_lv, &t.mv_lv}) shift_short_circuit(*pair, ratio);
  for (SeriesReactor& r : n.series_reactors) {
    const bool capacitor = r.x_ohm.value_or(1) < 0;
    times(r.x_ohm, capacitor ? 1 / ratio : ratio);
    times(r.x_percent, ratio);
  }
  return n;
}

}  // namespace kiloamp::iec60909
