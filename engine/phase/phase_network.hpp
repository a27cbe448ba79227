// Faults in phase coordinates: a, b, c and neutral points, transformers as wired windings. The independent
// check of the sequence solution.
#pragma once
#include <array>
#include <complex>
#include <memory>
#include <vector>

#include "engine/network/network.hpp"

namespace kiloamp::phase {

using Complex = std::complex<double>;
using Phases = std::array<Complex, 3>;

/// A short circuit between phases and, when `earthed`, to earth. Each faulted phase goes through
/// phase_impedance_ohm to a common point, which floats or goes through earth_impedance_ohm to earth. Prefault
/// phase a of the bus is at 0 degrees.
struct PhaseFault {
  BusIndex bus{};
  std::array<bool, 3> faulted{};
  bool earthed = false;
  Complex phase_impedance_ohm = 0, earth_impedance_ohm = 0;
  double prefault_ln_kv = 0;
};

/// Current from the element into the faulted bus [kA].
struct PhaseContribution {
  ElementRef element;
  BusIndex bus{};
  Phases current_ka{};
};

struct PhaseSolution {
  Phases fault_current_ka{};
  std::vector<PhaseContribution> contributions;
  std::vector<Phases> voltage_change_kv;  ///< per bus, phase to earth, against the prefault state
};

/// The network in modified nodal form, factorised once by a sparse LU with pivoting.
///
/// Unknowns: three voltages to earth per node, the potential of each star point that is not solidly earthed,
/// and for each transformer the limb voltages e and the windings' ampere-turns J (in per unit of its rating):
///   winding voltage / rated = M e + Z J,   sum over windings of M^T J = Y_m e,
/// with M = 1 for star and delta windings and M = (1 - P)/sqrt(3) for a zigzag winding, whose halves sit on
/// two limbs. Z and Y_m are 3 x 3 and cyclic, made of the positive- and zero-sequence data of the nameplate.
/// Windings are wired to the terminals by vector group and clock. A section that nothing ties to earth has
/// its common potential fixed at one node, where no current flows; a fault to earth in it is solved with that
/// tie removed. Islands without a source are fixed in the same way and carry no fault. Source: Dommel, notes
/// on modified nodal analysis, and the wiring of IEC 60076-1 groups (from memory). Shares only engine/network
/// with the sequence path.
class PhaseNetwork {
 public:
  /// @param prepared  after fill_defaults, with the state applied
  /// @throws std::runtime_error  the equations are singular
  explicit PhaseNetwork(const Network& prepared, bool include_shunts = false);
  ~PhaseNetwork();
  PhaseNetwork(const PhaseNetwork&) = delete;
  PhaseNetwork& operator=(const PhaseNetwork&) = delete;

  /// The bus must have a source. @throws std::runtime_error  the solution does not satisfy its equations
  [[nodiscard]] PhaseSolution solve(const PhaseFault& fault) const;

 private:
  struct Body;
  std::unique_ptr<Body> body_;
};

}  // namespace kiloamp::phase
