// Elements that drive a fault current: grid connections, rotating machines, inverters.
#pragma once
#include <complex>

#include "engine/network/identifiers.hpp"

namespace kiloamp {

/// Which of the two usual meanings an earth-fault level in MVA has (I1 = current of a line-to-ground fault, U
/// line to line).
enum class EarthFaultMvaBasis : std::uint8_t {
  three_phase,  ///< S = sqrt(3) U I1: compared at a glance with the three-phase level
  single_phase  ///< S = U I1 / sqrt(3): what the faulted phase alone carries
};

/// Fault level of a grid at its connection point. Either levels (three-phase current or power, x_over_r, and
/// at most one way of saying the earth-fault level) or outright impedances at the bus's nominal voltage.
struct FeederLevel {
  std::optional<double> three_phase_ka, three_phase_mva, x_over_r;
  std::optional<double> line_to_ground_ka, line_to_ground_mva, x0_over_r0;
  std::optional<EarthFaultMvaBasis> line_to_ground_mva_basis;
  std::optional<double> x0_over_x1, r0_over_x0;
  std::optional<double> z2_over_z1;
  /// The voltage, in per unit of nominal, that the levels were computed with (1 when not given; IEC 60909-0
  /// studies then take their own c).
  std::optional<double> voltage_factor;
  std::optional<double> r1_ohm, x1_ohm, r2_ohm, x2_ohm, r0_ohm, x0_ohm;

  [[nodiscard]] bool is_outright() const { return x1_ohm.has_value(); }
  [[nodiscard]] bool has_earth_fault_level() const {
    return line_to_ground_ka || line_to_ground_mva || x0_over_x1 || x0_ohm;
  }
};

/// The grid behind a connection point. `min` describes its weakest state, `max` its strongest.
struct NetworkFeeder : Element {
  BusIndex bus{};
  FeederLevel max;
  std::optional<FeederLevel> min;
};

enum class MachineRole : std::uint8_t { generator, motor, condenser };
enum class Rotor : std::uint8_t { cylindrical, salient_pole };
enum class Excitation : std::uint8_t { rotating, static_compound, static_terminal_fed };

/// Generator, synchronous motor or condenser; percentages on rated_mva and rated_kv.
struct SynchronousMachine : Element {
  BusIndex bus{};
  MachineRole role = MachineRole::generator;
  double rated_mva = 0, rated_kv = 0;
  std::optional<double> power_factor;
  double xd_subtransient_percent = 0;
  std::optional<double> xd_transient_percent, xd_percent, x2_percent, x0_percent;
  std::optional<double> ra_percent, x_over_r;
  std::optional<Neutral> neutral;
  std::optional<double> td_subtransient_s, td_transient_s, ta_s;
  std::optional<Rotor> rotor;
  std::optional<bool> damper_winding;
  std::optional<Excitation> excitation;
  std::optional<double> voltage_range_percent;   ///< how far the generator voltage lies above rated for good
  std::optional<double> lambda_max, lambda_min;  ///< steady-state short-circuit current over rated current
};

/// `count` identical asynchronous motors, or a group given by its sum. The size is said in exactly one of
/// four ways.
struct InductionMotor : Element {
  BusIndex bus{};
  std::optional<int> count;
  std::optional<double> rated_kw, rated_mw, rated_hp, rated_mva;
  std::optional<double> power_factor, efficiency_percent;
  double rated_kv = 0;
  std::optional<double> locked_rotor_ratio, r_over_x;
  std::optional<int> pole_pairs;
  std::optional<double> speed_rpm;
  std::optional<bool> converter_fed, feeds_back;

  /// False for a motor behind a converter that cannot return energy: it drives no fault current.
  [[nodiscard]] bool drives_fault_current() const {
    return !converter_fed.value_or(false) || feeds_back.value_or(false);
  }
};

enum class NegativeSequence : std::uint8_t { none, impedance };

/// A doubly fed machine: an impedance whose short circuit has the peak that the maker states.
struct DoublyFed {
  double peak_ka = 0;           ///< highest instantaneous current for a three-phase fault at the source's bus
  std::optional<double> kappa;  ///< that the peak contains; 1.7 when unknown
  double r_over_x = 0;
};

/// Full-converter source (photovoltaic, battery, wind, uninterruptible supply), or a doubly fed machine.
struct InverterSource : Element {
  BusIndex bus{};
  double rated_mva = 0, rated_kv = 0;
  std::optional<double> fault_current_ratio, current_angle_deg;
  std::optional<NegativeSequence> negative_sequence;
  std::optional<double> z2_percent, x2_over_r2;
  std::optional<DoublyFed> doubly_fed;
};

/// Z = sqrt(2) kappa Ur / (sqrt(3) i_peak), split by r_over_x; the same in positive and negative sequence.
/// Source: IEC 60909-0:2016, 6.8.3 (from memory).
[[nodiscard]] std::complex<double> doubly_fed_impedance_ohm(double rated_kv, const DoublyFed& machine);

/// A generator and its unit transformer, which IEC 60909-0 corrects as one.
struct PowerStationUnit : Element {
  std::uint32_t machine = 0;      ///< index in Network::synchronous_machines
  std::uint32_t transformer = 0;  ///< index in Network::transformers
};

}  // namespace kiloamp
