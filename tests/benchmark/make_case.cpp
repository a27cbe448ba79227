// Writes a synthetic network as a case file: make_case BUSES [SEED] > case.json
//
// A 380 kV overlay on a meshed 110 kV grid with double lines (coupled), transformers YNd and three-winding
// ones between; below each 110 kV station a 20 kV system of radial feeders with some rings, earthed through
// an impedance; feeders, machines and motors. About 1.3 branches a bus, three buses in four in trees or on
// chains. Invented data.
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <random>
#include <string>
#include <vector>

namespace {

class Writer {
 public:
  Writer(long buses, unsigned seed) : wanted_(buses), random_(seed) {}

  void write() {
    const long stations = std::max(1L, wanted_ / 24);
    const long side = std::max(1L, std::lround(std::sqrt(static_cast<double>(stations))));
    for (long s = 0; s < stations; ++s) bus("H" + std::to_string(s), 110);
    for (long s = 0; s < stations; s += 16) bus("E" + std::to_string(s), 380);
    long used = stations + (stations + 15) / 16;
    for (long s = 0; s < stations; ++s) {
      const long share = (wanted_ - used) / (stations - s);
      station(s, share);
      used += share;
    }
    for (long s = 0; s < stations; ++s) {
      if (s % side != 0) high_line("H", s - 1, s, chance(0.15));
      if (s >= side && chance(0.7)) high_line("H", s - side, s, false);
      if (s % 40 == 0) machine(s);
    }
    for (long s = 0; s < stations; s += 16) {
      if (s >= 16)
        line("E" + std::to_string(s - 16), "E" + std::to_string(s), uniform(30, 120), 0.03, 0.3, 0.2, 0.9);
      if (s >= 16 * side && chance(0.8))
        line("E" + std::to_string(s - 16 * side), "E" + std::to_string(s), uniform(30, 120), 0.03, 0.3, 0.2,
             0.9);
      three_winding(s);
      if (s % 160 == 0) feeder("E" + std::to_string(s));
    }
    print();
  }

 private:
  double uniform(double low, double high) { return low + (high - low) * (random_() / 4294967296.0); }
  bool chance(double p) { return uniform(0, 1) < p; }
  long whole(long low, long high) {
    return low + static_cast<long>(random_() % static_cast<unsigned long>(high - low + 1));
  }
  std::string next(const char* kind) { return kind + std::to_string(++count_); }

  template <typename... Values>
  static std::string format(const char* pattern, Values... values) {
    char text[700];
    std::snprintf(text, sizeof text, pattern, values...);
    return text;
  }

  void bus(const std::string& id, double kv) {
    buses_.push_back(format(R"({"id": "%s", "nominal_kv": %g})", id.c_str(), kv));
  }

  std::string line(const std::string& a, const std::string& b, double km, double r, double x, double r0,
                   double x0) {
    const std::string id = next("L");
    lines_.push_back(format(
        R"({"id": "%s", "from": "%s", "to": "%s", "kind": "%s", "length_km": %.3f, "r1_ohm_per_km": %.4f, "x1_ohm_per_km": %.4f, "r0_ohm_per_km": %.4f, "x0_ohm_per_km": %.4f, "b0_us_per_km": 3.1})",
        id.c_str(), a.c_str(), b.c_str(), x < 0.2 ? "cable" : "overhead", km, r, x, r0, x0));
    return id;
  }
  void high_line(const char* level, long a, long b, bool twice) {
    const double km = uniform(4, 35);
    const std::string from = level + std::to_string(a), to = level + std::to_string(b);
    const std::string first = line(from, to, km, 0.12, 0.4, 0.32, 1.25);
    if (!twice) return;
    const std::string second = line(from, to, km, 0.12, 0.4, 0.32, 1.25);
    couplings_.push_back(format(
        R"({"id": "%s", "line_a": "%s", "line_b": "%s", "length_km": %.3f, "r0m_ohm_per_km": 0.2, "x0m_ohm_per_km": 0.7})",
        next("K").c_str(), first.c_str(), second.c_str(), km * 0.999));
  }

  // A 20 kV bus behind a transformer, with feeders: a tree of short chains, a fifth of the ends closed to
  // rings.
  void station(long s, long count) {
    if (count < 1) return;
    const std::string head = "M" + std::to_string(s) + "_0";
    bus(head, 20);
    transformers_.push_back(format(
        R"({"id": "%s", "hv_bus": "H%ld", "lv_bus": "%s", "rated_mva": 40, "hv_kv": 110, "lv_kv": 21, "z_percent": %.2f, "x_over_r": 25, "vector_group": "%s", %s})",
        next("T").c_str(), s, head.c_str(), uniform(10, 15), s % 3 == 0 ? "YNd5" : "Dyn5",
        s % 3 == 0 ? R"("hv_neutral": {"grounding": "solid"})"
                   : R"("lv_neutral": {"grounding": "impedance", "r_ohm": 20})"));
    for (long k = 1; k < count; ++k) {
      const std::string id = "M" + std::to_string(s) + "_" + std::to_string(k);
      bus(id, 20);
      const long parent = chance(0.75) ? k - 1 : whole(0, k - 1);
      line("M" + std::to_string(s) + "_" + std::to_string(parent), id, uniform(0.2, 3), 0.16, 0.12, 0.6,
           0.35);
      if (k > 3 && chance(0.3))
        line("M" + std::to_string(s) + "_" + std::to_string(whole(0, k - 2)), id, uniform(0.2, 3), 0.16, 0.12,
             0.6, 0.35);
      if (chance(0.06))
        motors_.push_back(format(
            R"({"id": "%s", "bus": "%s", "rated_mw": %.2f, "rated_kv": 20, "power_factor": 0.88, "efficiency_percent": 96, "locked_rotor_ratio": 5.5, "pole_pairs": 2, "r_over_x": 0.1})",
            next("A").c_str(), id.c_str(), uniform(0.5, 4)));
    }
  }

  void three_winding(long s) {
    three_windings_.push_back(format(
        R"({"id": "%s", "hv_bus": "E%ld", "mv_bus": "H%ld", "hv_kv": 400, "mv_kv": 115, "lv_kv": 30, "hv_mv": {"rated_mva": 300, "z_percent": 17, "x_over_r": 60}, "hv_lv": {"rated_mva": 60, "z_percent": 12, "x_over_r": 40}, "mv_lv": {"rated_mva": 60, "z_percent": 7, "x_over_r": 40}, "vector_group": "YNyn0d5", "hv_neutral": {"grounding": "solid"}, "mv_neutral": {"grounding": "solid"}})",
        next("W").c_str(), s, s));
  }
  void feeder(const std::string& bus_id) {
    feeders_.push_back(format(
        R"({"id": "%s", "bus": "%s", "max": {"three_phase_ka": %.2f, "x_over_r": 14, "line_to_ground_ka": %.2f, "x0_over_r0": 8}})",
        next("Q").c_str(), bus_id.c_str(), 30.0, 26.0));
  }
  void machine(long s) {
    machines_.push_back(format(
        R"({"id": "%s", "bus": "H%ld", "role": "generator", "rated_mva": %.0f, "rated_kv": 110, "xd_subtransient_percent": %.1f, "x0_percent": 8, "ra_percent": 0.3, "power_factor": 0.85, "neutral": {"grounding": "solid"}})",
        next("G").c_str(), s, uniform(40, 250), uniform(14, 28)));
  }

  static void section(const char* name, const std::vector<std::string>& elements) {
    if (elements.empty()) return;
    std::printf(",\n  \"%s\": [\n    ", name);
    for (std::size_t i = 0; i < elements.size(); ++i) {
      if (i > 0) std::fputs(",\n    ", stdout);
      std::fputs(elements[i].c_str(), stdout);
    }
    std::fputs("]", stdout);
  }
  void print() const {
    std::printf(
        "{\n  \"format\": \"kiloamp-case\", \"version\": 1, \"title\": \"synthetic network, %zu buses\", "
        "\"frequency_hz\": 50",
        buses_.size());
    section("buses", buses_);
    section("network_feeders", feeders_);
    section("synchronous_machines", machines_);
    section("induction_motors", motors_);
    section("lines", lines_);
    section("mutual_couplings", couplings_);
    section("transformers", transformers_);
    section("three_winding_transformers", three_windings_);
    std::fputs("\n}\n", stdout);
  }

  long wanted_;
  std::mt19937 random_;
  long count_ = 0;
  std::vector<std::string> buses_, feeders_, machines_, motors_, lines_, couplings_, transformers_,
      three_windings_;
};

}  // namespace

int main(int argc, char** argv) {
  const long buses = argc > 1 ? std::atol(argv[1]) : 0;
  if (buses < 10) {
    std::fputs("usage: make_case BUSES [SEED] > case.json   (BUSES from 10)\n", stderr);
    return 2;
  }
  Writer(buses, argc > 2 ? static_cast<unsigned>(std::atol(argv[2])) : 1U).write();
  return 0;
}
