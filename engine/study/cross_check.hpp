// The same faults solved again in phase coordinates, and the largest difference.
#pragma once
#include "engine/study/study.hpp"

namespace kiloamp {

/// Differences are relative: currents to the larger of the fault current and 1e-6 of the bus's prefault
/// voltage over 1 ohm, voltages to the prefault voltage of their bus.
struct CrossCheck {
  double largest = 0;  ///< over fault currents, contributions and the voltages that the study reports
  BusIndex bus{};      ///< where the largest was found
  FaultKind kind = FaultKind::three_phase;
  std::string quantity;    ///< "fault current", "contribution of <id>", "voltage at <id>"
  std::size_t faults = 0;  ///< how many faults were compared
};
inline constexpr double kCrossCheckLimit = 1e-6;

/// Faults inside a power station unit have a network of their own and are not compared.
/// Solves the study's faults with engine/phase, which shares nothing with the sequence path but the network.
/// @throws sparse::NumericalError  the phase-coordinate equations cannot be solved
[[nodiscard]] CrossCheck cross_check(const Study& study);

}  // namespace kiloamp
