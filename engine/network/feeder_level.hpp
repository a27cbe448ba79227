// Fault levels of a grid as impedances.
#pragma once
#include <array>
#include <complex>

#include "engine/network/sources.hpp"

namespace kiloamp {

/// [0] zero, [1] positive, [2] negative sequence, in ohm; empty: no path.
using SequenceImpedances = std::array<std::optional<std::complex<double>>, 3>;

/// Positive, negative and zero sequence impedance of a grid at its connection point.
///
/// |Z1| = Un / (sqrt(3) I3), split by x_over_r; Z2 = Z1 z2_over_z1. Z0 from the earth-fault current I1: the
/// Z0 of angle atan(x0_over_r0) for which |Z1 + Z2 + Z0| = sqrt(3) Un / I1 (larger root of the quadratic in
/// |Z0|), or by x0_over_x1 and r0_over_x0, or as given. Empty zero sequence: nothing is said of earth faults.
/// @return empty when no Z0 >= 0 gives that I1: the levels contradict each other.
/// Source: definitions of the symmetrical components; IEC 60909-0:2016, 6.2 (from memory): c is the level's
/// own voltage_factor, 1 when it has none; every impedance that follows from a level is c times that of c
/// = 1.
[[nodiscard]] std::optional<SequenceImpedances> feeder_impedance_ohm(const FeederLevel& level,
                                                                     double nominal_kv);

}  // namespace kiloamp
