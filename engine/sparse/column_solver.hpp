// Solutions of A x = b for blocks of right-hand sides in all lanes, sparse or full.
#pragma once
#include <array>
#include <complex>
#include <span>
#include <vector>

#include "engine/sparse/lane_factors.hpp"

namespace kiloamp::sparse {

/// One entry of a sparse vector, different in each lane if need be (0 where the lane has none).
template <typename Scalar, int Lanes>
struct Term {
  Index row;
  std::array<Scalar, Lanes> value;
};

/// Right-hand sides side by side where many are wanted: four share each load of an entry of L.
inline constexpr int kWideBlock = 4;

/// Works through up to kBlock (2 or 4) right-hand sides at once on one set of factors. One per thread; keeps
/// its memory.
///
/// Use: clear(); put() the right-hand sides; solve(); read with get(). Right-hand sides that are never put
/// are zero. solve() walks forward only along the elimination tree paths of the rows that were put, so a
/// column of the inverse costs its path and one backward pass over L.
template <typename Scalar, int Lanes, int Block = kWideBlock>
class ColumnSolver {
 public:
  static constexpr int kBlock = Block;
  using Entry = std::array<Scalar, Lanes>;
  using Row = std::array<Pack<Scalar, kBlock>, static_cast<std::size_t>(Lanes)>;

  explicit ColumnSolver(const LaneFactors<Scalar, padded_width(Lanes)>& factors);

  void clear();
  /// Adds `value` to row `row` of right-hand side `which` (0 .. kBlock - 1).
  void put(int which, Index row, const Entry& value);
  /// Solves. With `wanted` given, only those rows (and the way to them) of the solution are computed.
  void solve();
  void solve_at(std::span<const Index> wanted);
  [[nodiscard]] Entry get(int which, Index row) const;
  /// Copies solution `which`, in row order.
  void copy(int which, std::span<Entry> out) const;
  /// Replaces one number of a solution.
  void set(int which, Index row, int lane, Scalar value);
  /// Place of a row in the elimination order, and so in memory.
  [[nodiscard]] Index position(Index row) const;
  /// All right-hand sides at one position of the elimination order, after solve().
  [[nodiscard]] const Row& at_position(Index position) const {
    return x_[static_cast<std::size_t>(position)];
  }

 private:
  void add_path(std::vector<Index>& path, std::vector<Index>& stamps, Index position);
  void forward();
  /// Lanes outside [First, End) have no right-hand side and get zeros.
  template <int First, int End>
  void backward(Index position);
  /// Calls backward for positions in their order, with the lanes that are needed.
  template <typename Range>
  void backward_all(const Range& positions);

  const LaneFactors<Scalar, padded_width(Lanes)>* factors_;
  const EliminationPlan* plan_;
  LineArray<Row> x_;  // by position; only what a solution needs is touched
  std::vector<Index> forward_stamp_;
  std::vector<Index> wanted_stamp_;
  std::vector<Index> path_;  // positions that hold a right-hand side or receive one, unsorted
  std::vector<Index> wanted_path_;
  Index stamp_ = 0;
  std::array<bool, static_cast<std::size_t>(Lanes)>
      filled_{};  // lanes with a right-hand side that is not zero
};

}  // namespace kiloamp::sparse
