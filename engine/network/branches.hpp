// Elements between buses, and from a bus to earth.
#pragma once
#include "engine/network/identifiers.hpp"

namespace kiloamp {

enum class LineKind : std::uint8_t { overhead, cable };

/// Overhead line or cable. Values per km of one circuit at conductor temperature 20 degrees C; `parallel`
/// identical uncoupled circuits.
struct Line : Element {
  BusIndex from{}, to{};
  std::optional<LineKind> kind;
  double length_km = 0;
  double r1_ohm_per_km = 0, x1_ohm_per_km = 0;
  std::optional<double> b1_us_per_km;
  std::optional<double> r0_ohm_per_km, x0_ohm_per_km, b0_us_per_km;
  std::optional<int> parallel;
  std::optional<double> end_temperature_c;
  /// While out of service both ends are connected to earth, so that current induced by coupled lines can flow
  /// in it.
  std::optional<bool> earthed_when_out;
};

/// Zero-sequence coupling of two lines over length_km; starts from_km[0] from line_a's `from` end and
/// from_km[1] from line_b's.
struct MutualCoupling : Element {
  std::uint32_t line_a = 0, line_b = 0;  ///< indices in Network::lines
  double length_km = 0;
  double r0m_ohm_per_km = 0, x0m_ohm_per_km = 0;
  std::optional<int> orientation;  ///< 1: both `from` ends at the same side; -1: at opposite sides
  std::optional<std::vector<double>> from_km;
};

enum class Winding : std::uint8_t { delta, star, star_neutral, zigzag, zigzag_neutral };
[[nodiscard]] constexpr bool has_neutral(Winding w) {
  return w == Winding::star_neutral || w == Winding::zigzag_neutral;
}

/// One lower-voltage winding of a vector group: its connection and how many times 30 degrees it lags the
/// high-voltage side.
struct ClockedWinding {
  Winding winding = Winding::star;
  int clock = 0;
  friend bool operator==(const ClockedWinding&, const ClockedWinding&) = default;
};

/// IEC 60076-1 vector group. `text` is what the user wrote; `lower` has one entry for two windings, two for
/// three.
struct VectorGroup {
  std::string text;
  Winding hv = Winding::star;
  std::vector<ClockedWinding> lower;
  bool auto_symbol = false;  ///< the group itself says autotransformer ("YNa0")
};

/// Reads "Dyn11", "YNyn0d5", "YNa0d11". Empty when the text is no vector group of IEC 60076-1: a winding
/// letter, or a clock number of the wrong parity (odd between star and delta or star and zigzag; even
/// otherwise) or past 11.
[[nodiscard]] std::optional<VectorGroup> parse_vector_group(const std::string& text);

enum class Side : std::uint8_t { hv, mv, lv };
struct Tap {
  Side side = Side::hv;
  double position_percent = 0;  ///< added turns of that side, percent of its rated turns
};
/// Core forms; what they decide is the path of zero-sequence flux.
enum class Core : std::uint8_t { three_limb, five_limb, shell, single_phase_bank };

/// The heaviest load before the fault, at the lower-voltage side.
struct WorstLoad {
  double voltage_kv = 0, current_a = 0, power_factor = 1;
};

/// Two-winding transformer; percentages on rated_mva and on the tapped rated voltages.
struct Transformer : Element {
  BusIndex hv_bus{}, lv_bus{};
  double rated_mva = 0, hv_kv = 0, lv_kv = 0;
  double z_percent = 0;
  std::optional<double> r_percent, x_over_r, load_loss_kw;
  VectorGroup vector_group;
  std::optional<double> z0_percent, r0_percent;  ///< zero-sequence short-circuit impedance
  std::optional<double> zm0_percent;             ///< zero-sequence magnetising reactance
  std::optional<Neutral> hv_neutral, lv_neutral;
  std::optional<Tap> tap;
  std::optional<bool> on_load_tap_changer;
  std::optional<double> tap_range_percent;
  std::optional<WorstLoad> worst_load;
  std::optional<Core> core;
};

/// Short-circuit data of one pair of windings, on rated_mva of the pair.
struct WindingPair {
  double rated_mva = 0, z_percent = 0;
  std::optional<double> r_percent, x_over_r, load_loss_kw;
  std::optional<double> z0_percent, r0_percent;
};

/// Three-winding transformer or autotransformer. Without lv_bus the tertiary is buried or unloaded.
struct ThreeWindingTransformer : Element {
  BusIndex hv_bus{}, mv_bus{};
  std::optional<BusIndex> lv_bus;
  double hv_kv = 0, mv_kv = 0, lv_kv = 0;
  WindingPair hv_mv, hv_lv, mv_lv;
  VectorGroup vector_group;
  std::optional<Neutral> hv_neutral, mv_neutral, lv_neutral;
  std::optional<Tap> tap;
  std::optional<bool> autotransformer;
  std::optional<double> zm0_percent;  ///< on hv_mv.rated_mva
  std::optional<Core> core;

  [[nodiscard]] bool is_auto() const { return autotransformer.value_or(false); }
};

/// Zigzag or star-delta earthing transformer: a zero-sequence path and nothing else.
struct EarthingTransformer : Element {
  BusIndex bus{};
  double r0_ohm = 0, x0_ohm = 0;  ///< per phase
  std::optional<Neutral> neutral;
};

/// Current-limiting reactor (x > 0) or series capacitor (x < 0); the same in all three sequences.
struct SeriesReactor : Element {
  BusIndex from{}, to{};
  std::optional<double> x_ohm, r_ohm;
  std::optional<double> x_percent, rated_kv, rated_a;
};

/// Capacitor bank (mvar > 0) or reactor (mvar < 0) in star, its star point earthed when `grounded`.
struct Shunt : Element {
  BusIndex bus{};
  double mvar = 0, rated_kv = 0;
  std::optional<bool> grounded;
};

/// Switch, disconnector or bus coupler without impedance.
struct BusSwitch : Element {
  BusIndex from{}, to{};
  bool closed = true;
};

}  // namespace kiloamp
