// What a fault is, and what is known of one when it is solved.
#pragma once
#include <vector>

#include "engine/sequence/sequence_model.hpp"

namespace kiloamp {

enum class FaultKind : std::uint8_t { three_phase, line_to_ground, line_to_line, double_line_to_ground };
inline constexpr std::array kAllFaults{FaultKind::three_phase, FaultKind::line_to_ground,
                                       FaultKind::line_to_line, FaultKind::double_line_to_ground};

/// a = 1 at 120 degrees.
inline const Complex kA{-0.5, 0.86602540378443864676};

/// Phase values of sequence values (0, 1, 2), and back: x_a = x0 + x1 + x2, x_b = x0 + a^2 x1 + a x2, x_c =
/// x0 + a x1 + a^2 x2. Source: Fortescue's transform.
[[nodiscard]] std::array<Complex, 3> to_phases(const BySequence<Complex>& sequence);
[[nodiscard]] BySequence<Complex> to_sequence(const std::array<Complex, 3>& phases);
/// Largest magnitude of the three phases.
[[nodiscard]] double largest_phase(const BySequence<Complex>& sequence);

/// A short circuit. Every faulted phase goes through phase_ohm to a common point; in an earth fault that
/// point goes through earth_ohm to earth. Line-to-ground is on phase a, the two-phase faults are on b and c.
/// Hence between two phases lies 2 phase_ohm.
struct Fault {
  BusIndex bus{};
  FaultKind kind = FaultKind::three_phase;
  Complex phase_ohm = 0, earth_ohm = 0;
};

/// Sequence currents [pu] of a fault at a place with Thevenin impedances z [pu] behind the voltage e [pu]; zf
/// = phase_ohm and ze = earth_ohm in pu.
///
///   three-phase           I1 = e / (Z1 + zf)
///   line-to-ground        I0 = I1 = I2 = e / (Z1 + Z2 + Z0 + 3 zf + 3 ze)
///   line-to-line          I1 = -I2 = e / (Z1 + Z2 + 2 zf)
///   double line-to-ground I1 = e / (Z1' + Z2' Z0' / (Z2' + Z0')), Z1' = Z1 + zf, Z2' = Z2 + zf, Z0' = Z0 +
///   zf + 3 ze,
///                         I2 = -I1 Z0' / (Z2' + Z0'), I0 = -I1 Z2' / (Z2' + Z0')
/// Without a zero-sequence path (z0 empty) line-to-ground is 0 and double line-to-ground is the line-to-line
/// fault. Source: Grainger & Stevenson, Power System Analysis, 1994, ch. 12, from memory.
struct SequenceFault {
  BySequence<Complex> current{};
  Complex loop =
      0;  ///< the impedance whose X/R describes the fault: Z1', Z1'+Z2'+Z0', Z1'+Z2', Z1' + Z2' || Z0'
};
struct TheveninData {
  Complex z1 = 0, z2 = 0;
  std::optional<Complex> z0;
};
[[nodiscard]] SequenceFault connect_sequences(FaultKind kind, const TheveninData& z, Complex e, Complex zf,
                                              Complex ze);

/// Potential of the neutral [pu] that an earth fault gives an island without a path to earth, where no
/// zero-sequence current flows: V_a = 0 on line to ground, V_b = zf I_b on double line to ground.
[[nodiscard]] Complex earth_fault_shift_pu(FaultKind kind, const TheveninData& z, Complex e,
                                           const BySequence<Complex>& current, Complex zf);

/// Values of a bus that lags the faulted one by `clock` times 30 degrees, from those without phase shifts.
[[nodiscard]] BySequence<Complex> turned(const BySequence<Complex>& value, int clock);

/// Current from an element into a bus.
struct Contribution {
  ElementRef element;
  BusIndex bus{};
  BySequence<Complex> sequence_ka{};
};

/// Line-to-neutral voltages of a bus during the fault.
struct BusVoltage {
  BusIndex bus{};
  BySequence<Complex> sequence_kv{};
};

/// Current from earth into the star point of an element: 3 I0 of the winding, of both windings where they
/// share the neutral.
struct NeutralCurrent {
  ElementRef element;
  BusIndex bus{};  ///< the bus of the winding
  Complex current_ka = 0;
};

/// A solved fault. Angles: the faulted bus's own prefault phase-a voltage is at 0 degrees, also for what is
/// seen at other buses.
struct FaultResult {
  Fault fault;
  bool has_source = false;  ///< false: no source reaches the bus and every current is 0
  double prefault_kv = 0;   ///< line to neutral
  BySequence<Complex> sequence_ka{};
  double current_ka = 0;  ///< largest phase current
  /// Of the loop impedance of the fault. Empty: no resistance in it, or no current.
  std::optional<double> x_over_r;
  /// kappa sqrt(2) current_ka with kappa = 1.02 + 0.98 exp(-3 R/X). Empty when the loop is not inductive
  /// (then the formula has no meaning). Source of kappa: IEC 60909-0:2016, 8.1 (from memory).
  std::optional<double> peak_ka;
  Complex earth_current_ka = 0;                   ///< 3 I0
  std::optional<Complex> z1_ohm, z2_ohm, z0_ohm;  ///< empty: no source, no zero-sequence path
  std::vector<Contribution> contributions;        ///< of every element at the bus, closed switches included
  std::vector<Contribution> branch_currents;      ///< at the other buses within the depth asked for
  std::vector<BusVoltage> voltages;               ///< of the bus and of those within the depth
  std::vector<NeutralCurrent> neutrals;           ///< of the elements at those buses
};

}  // namespace kiloamp
