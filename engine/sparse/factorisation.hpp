// A = L D L^T of several lanes, with a pivoting LU behind it, and what follows from it.
#pragma once
#include <array>
#include <complex>
#include <functional>
#include <memory>
#include <span>
#include <vector>

#include "engine/sparse/analysis.hpp"
#include "engine/sparse/column_solver.hpp"
#include "engine/sparse/elimination.hpp"
#include "engine/sparse/inverse_on_pattern.hpp"

namespace kiloamp::sparse {

/// Largest mismatch |A z - e_k| of a computed column that is trusted without a further step. A unit is
/// injected, so this is Kirchhoff's current law to nine digits, four more than any result printed.
inline constexpr double kTrustedResidual = 1e-9;
/// A mismatch below kRoundingMargin * epsilon * (|A| |z|) is what any solver in double precision leaves,
/// pivoting or not (a large impedance to earth, for one): no remedy is tried.
inline constexpr double kRoundingMargin = 1e3;
/// A larger mismatch after every remedy means that the matrix is singular to working precision.
inline constexpr double kSingularResidual = 1e-6;
/// |a_kk z_kk| above this: row k cancelled down to rounding noise, so its island has no path to earth.
inline constexpr double kSingularMagnification = 1e14;

/// How far a lane's factors can be trusted.
struct Accuracy {
  /// Largest |A z - b|_inf probed, where z is a column of the inverse as delivered, or a sum of some, and b
  /// the unit vectors that belong to it.
  double residual = 0;
  /// Largest |entry met in a pivot row during elimination| / |largest entry of A|.
  double growth = 1;
  /// Largest of |a|, |v| over |d|: diagonal entry before elimination, largest other entry of the row, pivot.
  double worst_pivot_ratio = 1;
  /// True when columns and entries get one step of iterative refinement.
  bool refined = false;
  /// True when the symmetric elimination without pivoting was not good enough and a pivoting LU took over.
  bool pivoting = false;
};

/// A = L D L^T of each lane, and what follows from it.
///
/// Elimination does not pivot. Trust is measured: where no pivot row grew, two columns are computed along
/// their tree paths and A z - e_k is formed there; otherwise the columns of the worst pivots and a few others
/// are computed and A z - e_k is formed in full. A lane above kTrustedResidual (and above what rounding
/// excuses) gets one step of refinement; if that does not help, Eigen's SparseLU, which pivots, takes the
/// lane over. Both are right but slow for selected_inverse(): every column of that lane is then computed. No
/// lane affects another, nor does the number of threads affect any bit.
///
/// @throws NumericalError  a lane is singular to working precision; names the row where it showed, and the
/// lane.
template <typename Scalar, int Lanes>
class Factorisation {
 public:
  using Entry = std::array<Scalar, Lanes>;
  using SelectedInverse = InverseOnPattern<Scalar, Lanes>;

  Factorisation(std::shared_ptr<const Analysis> analysis, const Values<Scalar, Lanes>& values,
                int threads = 1);
  ~Factorisation();
  Factorisation(Factorisation&&) noexcept;
  Factorisation& operator=(Factorisation&&) noexcept;

  /// Other values on the same pattern, in the memory of the old ones. After a throw only refactorise() may
  /// follow.
  void refactorise(const Values<Scalar, Lanes>& values, int threads = 1);

  [[nodiscard]] const Analysis& analysis() const;
  [[nodiscard]] const std::array<Accuracy, Lanes>& accuracy() const;

  /// Every Z_ii and every Z_ij on the pattern; independent of `threads` bit for bit.
  [[nodiscard]] SelectedInverse selected_inverse(int threads = 1) const;
  /// The same into memory that the caller keeps.
  void selected_inverse(SelectedInverse& out, int threads = 1) const;

  /// Column k of Z = A^-1, all lanes. `out` has order() entries.
  void column(Index k, std::span<Entry> out) const;
  /// Columns rows[0], rows[1], ... of Z one behind the other: out[c * order() + i] = Z(i, rows[c]).
  void columns(std::span<const Index> rows, std::span<Entry> out) const;
  /// x = A^-1 b for any b, in place.
  void solve(std::span<Entry> b) const;

  /// One entry Z_ij of any place: costs the tree paths of i and j only.
  [[nodiscard]] Entry inverse_entry(Index i, Index j) const;

  /// Solutions for up to kBlock sparse right-hand sides at a time; see SparseSolver.
  class SparseSolver;
  [[nodiscard]] SparseSolver sparse_solver() const;

  /// L and D of all lanes; they serve a lane whose accuracy says neither refined nor pivoting.
  [[nodiscard]] const LaneFactors<Scalar, padded_width(Lanes)>& plain_factors() const;

 private:
  struct Body;
  std::unique_ptr<Body> body_;
};

/// Repeated sparse solutions in one piece of memory: one per thread, valid while the factorisation lives.
///
/// Same calls as ColumnSolver, but lanes that are refined or pivoting are treated as such.
template <typename Scalar, int Lanes>
class Factorisation<Scalar, Lanes>::SparseSolver {
 public:
  static constexpr int kBlock = ColumnSolver<Scalar, Lanes>::kBlock;

  explicit SparseSolver(const Factorisation& factorisation);

  void clear();
  void put(int which, Index row, const Entry& value);
  void solve();
  void solve_at(std::span<const Index> wanted);
  [[nodiscard]] Entry get(int which, Index row) const;
  void copy(int which, std::span<Entry> out) const;
  /// Where a row's solution lies among those of all rows: neighbours in memory have neighbouring numbers.
  [[nodiscard]] Index position(Index row) const { return plain_.position(row); }
  /// All kBlock solutions at one position, side by side in each lane.
  [[nodiscard]] const typename ColumnSolver<Scalar, Lanes>::Row& at_position(Index position) const {
    return plain_.at_position(position);
  }

 private:
  /// Recomputes the lanes that the plain factors do not serve, in full.
  void mend();

  const Body* body_;
  ColumnSolver<Scalar, Lanes> plain_;
  std::vector<std::pair<int, Term<Scalar, Lanes>>> right_hand_sides_;
};

extern template class Factorisation<std::complex<double>, 1>;
extern template class Factorisation<std::complex<double>, 3>;
extern template class Factorisation<std::complex<double>, 4>;
extern template class Factorisation<double, 1>;
extern template class Factorisation<double, 2>;
extern template class Factorisation<double, 4>;

}  // namespace kiloamp::sparse
