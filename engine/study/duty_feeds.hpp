// Which sources a device's current comes from.
#pragma once
#include "engine/fault/fault_network.hpp"
#include "engine/study/duty.hpp"

namespace kiloamp::detail {

/// Buses that closed switches join to the far end of `opened` without it; empty: they join it to `bus` too,
/// so that it stands in a loop of switches. `opened` is closed and ends at `bus`.
[[nodiscard]] std::vector<BusIndex> far_side(const SequenceModel& model, BusIndex bus, ElementRef opened);

/// One thread's way of splitting currents over the sources of a solved network by superposition, positive
/// sequence: source j alone drives
///   I_total,j = y_j Z_jk          of the fault current at k, and through the own branch's terminals
///   I_own,j = -sum_q y_pq (Z_qj - Z_qk Z_jk / Z_kk) y_j Z_kk + [j at the terminal itself] y_j Z_kk.
/// A part counts with its share in phase with the whole.
class FeedFinder {
 public:
  explicit FeedFinder(const FaultSolver& solver);

  /// Largest first, at most `most`; of the whole fault when the branch is a switch in a loop of switches.
  /// Empty: no current.
  [[nodiscard]] std::vector<DutyFeed> split(BusIndex bus, const std::optional<ElementRef>& branch,
                                            DutySide side, double through_ka, std::size_t most);

 private:
  using Solver = sparse::Factorisation<Complex, 3>::SparseSolver;
  struct Source {
    std::uint32_t terminal;
    Complex y;
  };
  /// A column of Z where it is asked for: at the sources in their order, then at the columns' own nodes.
  using Column = std::vector<Complex>;
  void solve_columns(const std::vector<Node>& nodes);

  const SequenceModel& model_;
  const FaultNetwork& solved_;
  Solver solver_;
  std::vector<Source> sources_;
  std::vector<sparse::Index> rows_;  ///< of the sources
  std::vector<Column> columns_;
};

}  // namespace kiloamp::detail
