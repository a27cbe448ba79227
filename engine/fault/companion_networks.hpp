// Positive-sequence networks beside a solved one: same buses and branches, other impedances.
#pragma once
#include <span>

#include "engine/fault/fault_solver.hpp"

namespace kiloamp {

/// Driving-point impedances of up to three further networks, from one factorisation with the solved network's
/// own ordering.
class CompanionNetworks {
 public:
  static constexpr std::size_t kMost = 3;

  /// @param models  models of the same case in the same state, whose elements may differ in their impedances
  /// and
  ///                whose sources may be fewer; at most kMost. Needed during construction only.
  /// @throws sparse::NumericalError  one of them cannot be solved
  CompanionNetworks(const FaultSolver& solved, std::span<const SequenceModel> models, int threads);

  /// Z_kk of the positive sequence of model `which` [pu]. Empty: no source reaches the bus there.
  [[nodiscard]] std::optional<Complex> impedance_pu(std::size_t which, BusIndex bus) const;

 private:
  const SequenceModel* model_;
  std::vector<std::array<Complex, kMost>> z_pu_;  ///< per node
  std::array<std::vector<bool>, kMost> has_source_;
};

/// A source whose current at a fault is wanted where it is large.
struct SourcePlace {
  Node node = Node::none;
  double least = 0;  ///< of |Z_jk| e_k / |Z_kk| [pu of voltage at the source's node j for a fault at k]
};

/// For each node k, the sources j for which |Z_jk| e_k / |Z_kk| > least_j, with Z_jk of the positive
/// sequence: the others are proven to be below by the bound of sparse::LargeEntries.
class NearSources {
 public:
  struct Near {
    std::uint32_t source;  ///< into the list given
    Complex z_pu;          ///< Z_jk
  };
  /// @param e_pu  prefault voltage per node
  NearSources(const FaultSolver& solved, std::span<const SourcePlace> sources, std::span<const double> e_pu,
              int threads);
  /// In the order of the sources.
  [[nodiscard]] std::span<const Near> at_node(Node node) const {
    return {near_.data() + start_[at(node)], near_.data() + start_[at(node) + 1]};
  }

 private:
  std::vector<std::size_t> start_;
  std::vector<Near> near_;
};

/// For every node i: the sum over the sources j of |Z_ij| I_j, positive sequence, in per unit.
[[nodiscard]] std::vector<double> weighted_transfer_pu(const FaultSolver& solved,
                                                       std::span<const std::pair<Node, double>> sources);

}  // namespace kiloamp
