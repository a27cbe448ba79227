// Words shared by everything in engine/sparse: rows, places of a pattern, numerical failure.
#pragma once
#include <cstdint>
#include <stdexcept>
#include <string>

namespace kiloamp::sparse {

/// A row (= column) of a symmetric matrix, 0 <= row < order.
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

}  // namespace kiloamp::sparse
