// What IEC 60909-0 changes on a network before it is solved.
#pragma once
#include <complex>
#include <string>
#include <vector>

#include "engine/network/finding.hpp"
#include "engine/network/state.hpp"
#include "engine/standard/iec60909/formulas.hpp"

namespace kiloamp::iec60909 {

/// A factor on the impedances of an element, named as the standard names it.
struct Correction {
  ElementRef element;
  int part = 0;      ///< pair of a three-winding transformer: 0 hv-mv, 1 hv-lv, 2 mv-lv; else 0
  std::string name;  ///< "K_T", "K_G", "K_S", "K_SO", "K_G,S", "K_T,S", "K_G,SO", "K_T,SO"; "c" of a feeder
  double factor = 1;
};

/// Voltage factor at a bus for one kind of study. A bus up to 1 kV without voltage_tolerance_percent is taken
/// with 10 %.
[[nodiscard]] double voltage_factor(const Bus& bus, CaseKind kind, Edition edition);

/// Table 1 and clauses 6.2, 6.3.3, 6.6, 6.7 for every element in service of a network with its defaults
/// filled.
///
/// Feeders: c of their bus, unless their level brings its own. Transformers: K_T, or the form for a known
/// worst load. Machines: K_G; in a power station unit machine and transformer share K_S (on-load tap changer)
/// or K_SO. For the smallest currents edition 2016 takes every K as 1 (from memory). A neutral's impedance is
/// never corrected.
///
/// @param inside  the unit between whose machine and transformer the fault lies: K_G,S and K_T,S for it
/// @param missing  receives a finding for every figure that the factors need and the case lacks
[[nodiscard]] std::vector<Correction> corrections(const Network& network, CaseKind kind, Edition edition,
                                                  std::optional<std::uint32_t> inside,
                                                  std::vector<Finding>& missing);

/// Multiplies the impedances (neutrals excepted) by the factors and puts every tap to its main position.
void apply(const std::vector<Correction>& corrections, Network& network);

/// Positive-sequence impedance of a corrected element: of a feeder at its bus, of a machine at its rated
/// voltage, of a transformer at its high-voltage side, of a pair of windings at that of the higher voltage of
/// the two.
[[nodiscard]] std::optional<std::complex<double>> corrected_ohm(const Network& corrected,
                                                                const Correction& correction);

/// The same network at `ratio` times its frequency: every reactance of machines, feeders, motors,
/// transformers, lines and reactors in positive sequence times `ratio` (of a series capacitor: divided by
/// it), resistances as they are. With `fictitious_resistance` the machines' resistance is first replaced by
/// R_Gf of clause 6.6.1.
[[nodiscard]] Network at_frequency(const Network& corrected, double ratio, bool fictitious_resistance);

}  // namespace kiloamp::iec60909
