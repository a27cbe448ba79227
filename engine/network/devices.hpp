// Breakers, switches, fuses, switchboards and relays: what stands on a bus or at a branch's terminal and must
// cope with the fault current.
#pragma once
#include "engine/network/identifiers.hpp"

namespace kiloamp {

/// The document a device was rated to, hence the quantities it may be compared with.
enum class DeviceStandard : std::uint8_t {
  iec62271_100,       ///< high-voltage breaker, IEC
  iec62271_103,       ///< high-voltage switch, IEC
  iec62271_200,       ///< metal-enclosed high-voltage switchboard, IEC
  iec60947_2,         ///< low-voltage breaker, IEC
  iec60947_3,         ///< low-voltage switch, IEC
  iec61439,           ///< low-voltage switchboard, IEC
  iec60282_1,         ///< high-voltage fuse, IEC
  iec60269,           ///< low-voltage fuse, IEC
  c37_total_current,  ///< breaker rated on total current (before 1964)
  c37_k_factor,       ///< symmetrical rating with voltage range factor K
  c37_constant_ka,    ///< symmetrical rating, constant at every voltage up to the maximum
  c37_13,             ///< low-voltage power breaker
  c37_20,             ///< metal-enclosed switchgear
  ul489,              ///< moulded-case or insulated-case breaker
  c37_41,             ///< medium-voltage fuse
  ul248               ///< low-voltage fuse
};
/// Devices of one family are rated with the currents of one calculation and never judged with the other's.
enum class DeviceFamily : std::uint8_t { iec, ansi };
[[nodiscard]] constexpr DeviceFamily family_of(DeviceStandard standard) {
  return standard <= DeviceStandard::iec60269 ? DeviceFamily::iec : DeviceFamily::ansi;
}

/// Figures of a rating plate; each device writes those that its standard knows.
struct Device : Element {
  BusIndex bus{};
  std::optional<ElementRef> branch;  ///< empty: the device must cope with the total at the bus
  DeviceStandard standard = DeviceStandard::iec62271_100;
  std::optional<double> rated_kv, rated_a;
  std::optional<double> breaking_ka, making_peak_ka;
  std::optional<double> short_time_ka, short_time_s;
  std::optional<double> dc_time_constant_ms, opening_time_s;
  std::optional<double> icu_ka, ics_ka, icm_ka, icw_ka, icw_s;
  std::optional<double> k_factor, interrupting_mva, interrupting_ka, close_latch_rms_ka, close_latch_peak_ka;
  std::optional<double> interrupting_time_cycles, contact_parting_cycles;
  std::optional<double> test_power_factor;
  std::optional<bool> instantaneous_trip, fused;
  /// The owner's points of the standard's curve for faults with local ac decay: multiplying factor against
  /// X/R, ascending.
  std::optional<std::vector<double>> local_curve_x_over_r, local_curve_factor;
  std::optional<double> peak_withstand_ka;  ///< of a switchboard
};
struct Breaker : Device {};
struct Fuse : Device {};
/// Busbars and their enclosure: the total at the bus.
struct Switchboard : Device {};

enum class RelayFunction : std::uint8_t {
  phase_overcurrent,
  earth_overcurrent,
  negative_sequence_overcurrent,
  undervoltage,
  residual_overvoltage
};
enum class RelayCurve : std::uint8_t {
  definite_time,
  iec_a,
  iec_b,
  iec_c,
  ieee_moderately_inverse,
  ieee_very_inverse,
  ieee_extremely_inverse
};

/// One measuring element; pickups are secondary values.
struct RelayElement {
  RelayFunction function = RelayFunction::phase_overcurrent;
  std::optional<double> pickup_a, pickup_v;
  RelayCurve curve = RelayCurve::definite_time;
  std::optional<double> time_multiplier, time_s;
};

/// Relay at a bus, looking into `branch`; ct_ratio and vt_ratio as [primary, secondary].
struct Relay : Element {
  BusIndex bus{};
  std::optional<ElementRef> branch;
  std::optional<std::vector<double>> ct_ratio, vt_ratio;
  std::vector<RelayElement> elements;
};

}  // namespace kiloamp
