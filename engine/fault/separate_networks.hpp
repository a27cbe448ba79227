// Reactances and resistances reduced each for itself, as ANSI/IEEE standards find X/R.
#pragma once
#include "engine/fault/fault_solver.hpp"

namespace kiloamp {

/// Driving-point reactance of the network that holds every element's X alone, and resistance of the one that
/// holds every R alone, in pu. Not the parts of the complex impedance: in a meshed network they differ.
struct SeparateImpedance {
  double x1 = 0, r1 = 0;
  std::optional<double> x0, r0;  ///< empty: no zero-sequence path

  /// X/R of a fault: 3ph and LL X1/R1; LG (2 X1 + X0) / (2 R1 + R0); LLG the same with X1 + X1 X0 / (X1 +
  /// X0). Empty: not both positive (a capacitive network). Without zero-sequence path LG has none and LLG is
  /// LL.
  [[nodiscard]] std::optional<double> x_over_r(FaultKind kind) const;
};

/// Both networks of a model built with SequenceOptions::separate_parts: four real matrices (X1, X0, R1, R0)
/// side by side in one factorisation on the solved network's ordering. Source of the method: IEEE 551-2006
/// (from memory).
class SeparateNetworks {
 public:
  /// @throws sparse::NumericalError  one of them cannot be solved
  SeparateNetworks(const FaultSolver& solved, int threads);

  /// Empty: no source reaches the bus.
  [[nodiscard]] std::optional<SeparateImpedance> at_bus(BusIndex bus) const;

 private:
  const SequenceModel* model_;
  std::vector<std::array<double, 4>> z_pu_;  ///< per node: X1, X0, R1, R0
};

}  // namespace kiloamp
