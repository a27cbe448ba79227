// The sequence circuit of one element: small symmetric admittance matrices over its terminals.
#pragma once
#include <array>
#include <complex>
#include <optional>

#include "engine/network/feeder_level.hpp"
#include "engine/network/network.hpp"

namespace kiloamp {

using Complex = std::complex<double>;
/// One value per sequence, indexed by the sequence's number: [0] zero, [1] positive, [2] negative.
template <typename T>
using BySequence = std::array<T, 3>;
inline constexpr int kZero = 0, kPositive = 1, kNegative = 2;

/// Which part of every impedance a circuit is made of: the whole, or its reactance or resistance alone, as
/// the separate networks for X/R of the ANSI/IEEE standards need.
enum class Part : std::uint8_t { whole, reactance, resistance };
/// Element X/R beyond which no resistance is believed: an element whose data give none has X / 1000 in the
/// network of resistances.
inline constexpr double kLargestElementXOverR = 1000;
/// z; j Im z; or Re z, for which |Im z| / kLargestElementXOverR stands when it is 0.
[[nodiscard]] Complex part_of(Complex z, Part part);
/// The same for an impedance that closes a path only as a shunt of its own: charging, capacitor banks,
/// magnetising branches. It is no resistance to be reduced with others: in the network of resistances it is
/// kLargestElementXOverR |Im z|.
[[nodiscard]] Complex part_of_shunt(Complex z, Part part);

/// I = Y V over at most three terminals, per sequence: I_i [A, into the element], V_j [V], so Y in siemens,
/// symmetric.
///
/// Phase shifts of vector groups are not in Y (they are bookkeeping per bus); the reversal of zero sequence
/// by star-star groups with clock 2, 6, 10 is: it is the sign of a ratio.
struct Circuit {
  int terminals = 0;
  std::array<BusIndex, 3> bus{};
  /// Voltages of the terminals at which no current flows, up to a common factor, when a sequence has no path
  /// to earth in the element (ratio of an ideal transformer; equal for a line). Signed in zero sequence.
  std::array<double, 3> open_kv{1, 1, 1};
  BySequence<std::array<std::array<Complex, 3>, 3>> y_siemens{};
  /// Which terminals are joined by a current path: same number, same group; -1: the terminal sees an open
  /// circuit.
  BySequence<std::array<int, 3>> group{};
  /// Which terminals belong to a winding whose star point is earthed.
  std::array<bool, 3> neutral_earthed{};
  /// hv and mv share that star point.
  bool neutral_shared = false;
  /// True when a group of that sequence has a path to earth inside the element.
  BySequence<bool> earthed{};
};

/// Shunt circuit 1/Z at one bus; an empty impedance is an open circuit.
[[nodiscard]] Circuit shunt_circuit(BusIndex bus, const BySequence<std::optional<Complex>>& z_ohm);

/// Series circuit 1/Z between two buses of one voltage.
[[nodiscard]] Circuit series_circuit(BusIndex from, BusIndex to, const BySequence<Complex>& z_ohm);

/// Z1 = ra + j x"d, Z2 = ra + j x2, Z0 = ra + j x0 + 3 Zn, or open zero sequence when the neutral is. Source:
/// definition.
[[nodiscard]] BySequence<std::optional<Complex>> machine_impedance_ohm(const SynchronousMachine& machine);

/// |Z1| = Ur^2 / (Sr LRR), split by r_over_x; Z2 = Z1; zero sequence open. Sr = P / (eta cos phi), all motors
/// of the group together. Source: IEC 60909-0:2016, 6.10 (from memory). 1 hp = 0.745699872 kW (550 ft lbf/s,
/// by definition).
[[nodiscard]] BySequence<std::optional<Complex>> motor_impedance_ohm(const InductionMotor& motor);
[[nodiscard]] double motor_rated_mva(const InductionMotor& motor);

/// 3 Zn, or empty when the neutral is open or not there.
[[nodiscard]] std::optional<Complex> triple_neutral_ohm(const std::optional<Neutral>& neutral);

/// (R + jX) * length / parallel per sequence. The shunt part is apart: see line_charging_siemens.
[[nodiscard]] BySequence<Complex> line_impedance_ohm(const Line& line);
/// j B * length * parallel, whole line, per sequence.
[[nodiscard]] BySequence<Complex> line_charging_siemens(const Line& line);

[[nodiscard]] Complex reactor_impedance_ohm(const SeriesReactor& reactor);

/// Two-winding transformer, all IEC 60076-1 groups.
///
/// Positive and negative: Z_k between the windings with ratio hv_kv : lv_kv, the tapped side's voltage times
/// (1 + position/100). Zero, no zigzag: T of two arms Z_k0/2 and the magnetising branch j zm0 from the middle
/// to earth; a delta earths its arm's end, a star without earthed neutral opens its arm, an earthed star adds
/// 3 Zn and goes to its bus. Zero, zigzag: no ampere-turns cross. ZN earthed: Z_k0 + 3 Zn to earth; the other
/// side, if YN earthed: Z_k/2 + j zm0 + 3 Zn. Source: Grainger & Stevenson, Power System Analysis, 1994, ch.
/// 11 for the star and delta circuits (from memory); zigzag from the balance of ampere-turns on each limb.
[[nodiscard]] Circuit transformer_circuit(const Transformer& transformer, Part part = Part::whole);

/// Three-winding transformer or autotransformer: star of arms Z_A = (Z_AB + Z_AC - Z_BC) / 2 and cyclic in a
/// common base, the same from z0 for zero sequence. Autotransformer: the common neutral carries 3 (I0_hv +
/// I0_mv) amperes through Zn. Terminals: hv, mv and, when lv_bus is given, lv.
[[nodiscard]] Circuit three_winding_circuit(const ThreeWindingTransformer& transformer,
                                            Part part = Part::whole);

}  // namespace kiloamp
