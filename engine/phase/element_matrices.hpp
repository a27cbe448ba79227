// Phase matrices of elements from their nameplates.
#pragma once
#include <Eigen/Core>
#include <optional>
#include <vector>

#include "engine/phase/phase_network.hpp"

namespace kiloamp::phase {

using Matrix3 = Eigen::Matrix3cd;

/// The cyclic 3 x 3 matrix whose eigenvalues on (1,1,1), (1,a^2,a), (1,a,a^2) are m0, m1, m2.
[[nodiscard]] Matrix3 cyclic(Complex m0, Complex m1, Complex m2);

/// A source or shunt between the phases of a bus and earth [S]; `ties_to_earth`: its zero-sequence admittance
/// is not 0.
struct ShuntElement {
  ElementRef element;
  BusIndex bus;
  Matrix3 admittance;
  bool ties_to_earth;
  bool is_source;
};
[[nodiscard]] std::vector<ShuntElement> shunt_elements(const Network& network, bool include_shunts);

/// One or several coupled three-phase branches. Rows of `admittance`: three per end, from-end then to-end of
/// each line; `ends` names their buses.
struct BranchElement {
  struct End {
    ElementRef element;
    BusIndex bus;
  };
  std::vector<End> ends;
  std::vector<bool> charged;  ///< per line: its zero-sequence charging ties it to earth
  Eigen::MatrixXcd admittance;
};
[[nodiscard]] std::vector<BranchElement> branch_elements(const Network& network, bool include_shunts);

enum class Star : std::uint8_t {
  none,
  isolated,
  earthed
};  ///< star point: none (delta), floating, or earthed through `neutral_ohm`

/// One winding of a transformer on its three limbs.
struct WoundSide {
  std::optional<BusIndex> bus;  ///< empty: a buried delta
  Winding winding = Winding::star;
  Star star = Star::none;
  Complex neutral_ohm = 0;
  int shared_star = -1;  ///< index of the side whose star point this one uses
  double rated_ll_kv = 0;
  int turn = 0;     ///< terminal t is on limb (t + turn) mod 3
  double sign = 1;  ///< -1: the winding is reversed
  Matrix3 impedance_pu = Matrix3::Zero();
};
struct WoundTransformer {
  ElementRef element;
  double mva = 0;
  std::vector<WoundSide> sides;
  Complex zero_magnetising_pu = 0;  ///< admittance
};
[[nodiscard]] std::vector<WoundTransformer> wound_transformers(const Network& network);

}  // namespace kiloamp::phase
