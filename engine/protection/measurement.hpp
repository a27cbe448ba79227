// What a relay makes of the currents and voltages at its place.
#pragma once
#include "engine/fault/fault.hpp"

namespace kiloamp {

/// Primary values at a relay: currents from the bus into the branch, voltages of the bus to earth.
struct RelayQuantities {
  BySequence<Complex> current_ka{};
  BySequence<Complex> voltage_kv{};
};

/// (Z0 - Z1) / (3 Z1) of a line: an earth loop measures Z1 to the fault when 3 I0 k0 is added to its current.
/// Source: Horowitz & Phadke, Power System Relaying (from memory).
[[nodiscard]] Complex residual_compensation(Complex z1, Complex z0);

/// Primary ohm of the six loops: (Va - Vb) / (Ia - Ib) and cyclic, Va / (Ia + k0 3 I0) and cyclic. Empty:
/// less than kLeastLoopCurrent of the largest phase current flows in the loop.
struct LoopImpedances {
  std::optional<Complex> ab, bc, ca, a, b, c;
};
inline constexpr double kLeastLoopCurrent = 1e-6;
[[nodiscard]] LoopImpedances apparent_impedances(const RelayQuantities& q, Complex k0);

/// Which way the fault lies: forward when the fault's own components say that it is on the branch's side.
/// Unbalanced faults by negative sequence, forward when -V2 leads I2 by less than 90 degrees about the angle
/// of the source behind (`angle_rad`); balanced ones by I1 against the prefault voltage (memory). Empty: no
/// current.
enum class Direction : std::uint8_t { forward, reverse };
[[nodiscard]] std::optional<Direction> direction(const RelayQuantities& q, Complex prefault_kv,
                                                 double angle_rad);

}  // namespace kiloamp
