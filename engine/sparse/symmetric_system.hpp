// Symmetric sparse systems on one pattern: several matrices side by side ("lanes"), their inverses' entries.
#pragma once
#include <array>
#include <complex>
#include <cstdint>
#include <memory>
#include <span>
#include <stdexcept>
#include <vector>

namespace kiloamp::sparse {

using Index = std::int32_t;

/// An off-diagonal place (i, j) = (j, i) of the pattern; i != j, each unordered pair at most once.
struct Edge {
  Index i;
  Index j;
};

/// A factorisation that could not be trusted. `row` is a row of the matrix (not a bus), `lane` the matrix.
class NumericalError : public std::runtime_error {
 public:
  NumericalError(const std::string& what, Index row, int lane)
      : std::runtime_error(what), row_(row), lane_(lane) {}
  [[nodiscard]] Index row() const { return row_; }
  [[nodiscard]] int lane() const { return lane_; }

 private:
  Index row_;
  int lane_;
};

/// Elimination order and symbolic factorisation of a pattern; reused by every matrix that has the pattern.
class Analysis {
 public:
  Analysis(Index order, std::span<const Edge> edges);
  ~Analysis();
  Analysis(const Analysis&) = delete;
  Analysis& operator=(const Analysis&) = delete;

  [[nodiscard]] Index order() const;
  [[nodiscard]] std::span<const Edge> edges() const;

 private:
  struct Body;
  std::unique_ptr<Body> body_;
};

/// `Lanes` symmetric matrices: entry (i, i) of lane s is diagonal[i][s]; entry at edges[e] is
/// off_diagonal[e][s].
template <typename Scalar, int Lanes>
struct Values {
  std::vector<std::array<Scalar, Lanes>> diagonal;
  std::vector<std::array<Scalar, Lanes>> off_diagonal;
};

/// How far a lane's factors can be trusted.
struct Accuracy {
  /// Largest |A z - e_k|_inf over the probed columns k, where z is the computed column of the inverse.
  double residual = 0;
  /// Largest |entry met during elimination| / |largest entry of A|.
  double growth = 1;
  /// True when the symmetric elimination without pivoting was not good enough and a pivoting LU took over.
  bool pivoting = false;
};

/// A = L D L^T of each lane, and what follows from it.
///
/// @throws NumericalError  a lane is singular to working precision; names the row where it showed.
template <typename Scalar, int Lanes>
class Factorisation {
 public:
  using Entry = std::array<Scalar, Lanes>;

  /// Inverse entries at the places of the pattern: diagonal[i] = Z_ii, off_diagonal[e] = Z at edges[e].
  struct SelectedInverse {
    std::vector<Entry> diagonal;
    std::vector<Entry> off_diagonal;
  };

  Factorisation(std::shared_ptr<const Analysis> analysis, const Values<Scalar, Lanes>& values,
                int threads = 1);
  ~Factorisation();
  Factorisation(Factorisation&&) noexcept;
  Factorisation& operator=(Factorisation&&) noexcept;

  [[nodiscard]] const std::array<Accuracy, Lanes>& accuracy() const;

  /// Every Z_ii and every Z_ij on the pattern; independent of `threads` bit for bit.
  [[nodiscard]] SelectedInverse selected_inverse(int threads = 1) const;

  /// Column k of Z = A^-1, all lanes. `out` has order() entries.
  void column(Index k, std::span<Entry> out) const;

  /// One entry Z_ij of any place.
  [[nodiscard]] Entry inverse_entry(Index i, Index j) const;

 private:
  struct Body;
  std::unique_ptr<Body> body_;
};

extern template class Factorisation<std::complex<double>, 1>;
extern template class Factorisation<std::complex<double>, 3>;
extern template class Factorisation<double, 1>;
extern template class Factorisation<double, 2>;

}  // namespace kiloamp::sparse
