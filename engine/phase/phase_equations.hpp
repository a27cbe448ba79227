// Numbering and coefficients of the modified nodal equations.
#pragma once
#include <Eigen/SparseCore>
#include <vector>

#include "engine/phase/element_matrices.hpp"

namespace kiloamp::phase {

using SparseMatrix = Eigen::SparseMatrix<Complex>;

/// A transformer's place among the unknowns.
struct WoundPlace {
  Eigen::Index limbs = 0;                  ///< first of its three limb voltages
  std::vector<Eigen::Index> ampere_turns;  ///< per side: first of three, or the one of a buried delta
  std::vector<Eigen::Index> star;          ///< per side: the star point's potential, -1: earth, or no star
};

class PhaseEquations {
 public:
  PhaseEquations(const Network& network, bool include_shunts);

  /// Electrical node of a bus; -1: out of service.
  [[nodiscard]] int node(BusIndex bus) const { return node_of_bus_[at(bus)]; }
  [[nodiscard]] Eigen::Index row(BusIndex bus, int phase) const { return 3 * node(bus) + phase; }
  [[nodiscard]] const SparseMatrix& matrix() const { return matrix_; }
  /// The node whose common potential is fixed because nothing ties the bus's section to earth; -1: it is
  /// tied.
  [[nodiscard]] int pin_of(BusIndex bus) const;
  static constexpr double kPin_siemens = 1.0;

  /// Currents from every element into `bus` when the unknowns are `x` [kA].
  [[nodiscard]] std::vector<PhaseContribution> currents_into(BusIndex bus, const Eigen::VectorXcd& x) const;

 private:
  struct Sets;  // of nodes, in phase_equations.cpp
  void number_nodes(const Network& network);
  void number_transformers();
  void join_sections(Sets& zero, Sets& positive) const;
  void assemble(const Sets& zero, const Sets& positive);
  void stamp_transformer(std::size_t t, std::vector<Eigen::Triplet<Complex>>& entries) const;
  [[nodiscard]] Phases terminal_current(std::size_t t, std::size_t side, const Eigen::VectorXcd& x) const;

  std::vector<int> node_of_bus_;
  int nodes_ = 0;
  Eigen::Index unknowns_ = 0;
  std::vector<ShuntElement> shunts_;
  std::vector<BranchElement> branches_;
  std::vector<WoundTransformer> transformers_;
  std::vector<WoundPlace> places_;
  std::vector<int> pin_of_node_;
  SparseMatrix matrix_;
};

}  // namespace kiloamp::phase
