// Which reactance a rotating machine has in each of the three networks of the ANSI/IEEE standards.
#pragma once
#include <vector>

#include "engine/network/finding.hpp"

namespace kiloamp::ieee_c37 {

/// First cycle: momentary duty, fuses, low-voltage breakers. Interrupting: 1.5 to 4 cycles. Delayed: about 30
/// cycles, for relays with time delay.
enum class DutyNetwork : std::uint8_t { first_cycle, interrupting, delayed };

enum class MachineClass : std::uint8_t {
  generator,              ///< turbine generator, hydro generator with dampers, condenser
  hydro_without_dampers,  ///< salient poles, damper_winding false
  synchronous_motor,
  large_induction,   ///< above 1000 hp, or above 250 hp at one pole pair
  medium_induction,  ///< others from 50 hp
  small_induction    ///< below 50 hp
};
[[nodiscard]] const char* class_words(MachineClass machine);

/// Whether induction motors below 50 hp count in the first cycle: the combined network of IEEE 551 has them
/// with 1.67, the high-voltage network of C37.010 omits them.
enum class SmallMotors : std::uint8_t { combined, omitted };

/// Factor on X"d (X" of a motor), R with it so that X/R stays; empty: left out.
///
///   class                  first cycle        interrupting       delayed
///   generator              1                  1                  X'd for X"d
///   hydro without dampers  0.75 X'd           0.75 X'd           X'd
///   synchronous motor      1                  1.5                left out
///   large induction        1                  1.5                left out
///   medium induction       1.2                3                  left out
///   small induction        1.67 or left out   left out           left out
///
/// `transient_over_subtransient` = X'd / X"d, used where the table names X'd. Source: IEEE 551-2006 table
/// 9-1, IEEE 141 table 4-1, IEEE C37.010; delayed column IEEE 551 (from memory). Hydro without dampers: one
/// print of the table has 0.75 X"d in one row; 0.75 X'd is taken for right.
[[nodiscard]] std::optional<double> reactance_factor(MachineClass machine, DutyNetwork network,
                                                     SmallMotors small, double transient_over_subtransient);

/// Rated shaft power of one motor in hp (1 hp = 0.745699872 kW by definition); a rating in MVA without power
/// factor and efficiency counts 1 kVA as 1 hp (common practice, no source).
[[nodiscard]] double one_motor_hp(const InductionMotor& motor);
/// A motor whose speed the case does not say counts as two-pole: the larger current.
[[nodiscard]] MachineClass class_of(const InductionMotor& motor);
[[nodiscard]] MachineClass class_of(const SynchronousMachine& machine);

/// What a network does to one machine.
struct MachineReactance {
  ElementRef element;
  MachineClass machine_class = MachineClass::generator;
  std::optional<double> factor;  ///< empty: left out
};

/// Motors of which class_of assumes the speed, or one_motor_hp the power factor: what a report lists.
[[nodiscard]] std::vector<DefaultUse> assumed_of_motors(const Network& network);

/// Every machine and motor of the network in service that drives a fault current, in the order of the case.
/// @param missing  receives a finding for each machine that needs X'd and has none
[[nodiscard]] std::vector<MachineReactance> machine_reactances(const Network& network, DutyNetwork which,
                                                               SmallMotors small,
                                                               std::vector<Finding>& missing);

/// Multiplies the impedance of motors, R and X alike in positive and negative sequence, and X"d alone of
/// generators and condensers; takes out what is left out.
void apply(const std::vector<MachineReactance>& reactances, Network& network);

}  // namespace kiloamp::ieee_c37
