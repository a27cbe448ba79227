// The inner loop of an outage study: what four outages make of every bus's fault loops.
#pragma once
#include "engine/study/outage_worker.hpp"

namespace kiloamp::detail {

/// Small matrices of four outages side by side, and their solutions: a from the first column, c from the
/// second.
struct FourOutages {
  using Rows = sparse::Factorisation<Complex, 3>::SparseSolver;
  BySequence<std::array<sparse::Pack<Complex, 4>, 3>> gain{};  ///< G_11, 2 G_12, G_22
  BySequence<bool> second{};                                   ///< c counts in that sequence
  BySequence<std::size_t> lane{};                              ///< of the solutions
  const Rows* a = nullptr;
  const Rows* c = nullptr;
};

/// Writes |Z'|^2 of the three-phase and of the line-to-ground loop of every place:
/// Z' = Z + (G_11 a + 2 G_12 c) a + G_22 c^2 per sequence.
void change_loops(const FourOutages& four, const std::vector<OutagePlace>& places,
                  std::vector<sparse::FourDoubles>& three_phase,
                  std::vector<sparse::FourDoubles>& line_to_ground);

}  // namespace kiloamp::detail
