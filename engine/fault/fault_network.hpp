// The solved sequence networks, and how a unit fault current at one bus spreads over the elements around it.
#pragma once
#include "engine/fault/fault_solver.hpp"

namespace kiloamp::detail {

/// Current from `element` into `bus`, in per unit of the bus, for 1 pu of fault current in each sequence.
struct CurrentShare {
  ElementRef element;
  BusIndex bus;
  BySequence<Complex> per_fault_current;
  bool into_faulted_bus = false;
};
/// Voltage drop at `bus` [pu] for 1 pu of fault current in each sequence: Z_jk.
struct VoltageShare {
  BusIndex bus;
  BySequence<Complex> per_fault_current;
  double shift_ratio =
      0;  ///< of its zero-sequence potential to the faulted bus's when their island has no path to earth
};
/// Zero-sequence current of a winding with earthed star point [kA per pu of zero-sequence fault current].
struct NeutralShare {
  ElementRef element;
  BusIndex bus;
  Complex ka_per_fault_pu;
};
struct Reach {
  std::vector<CurrentShare> currents;
  std::vector<VoltageShare> voltages;
  std::vector<NeutralShare> neutrals;
  std::vector<sparse::Factorisation<Complex, 3>::Entry>
      column;  ///< scratch: Z e_k when the depth asks for it
};

/// Y assembled from the model's blocks and factorised once; inverse entries on its pattern.
class FaultNetwork {
 public:
  using Inverse = sparse::Factorisation<Complex, 3>::SelectedInverse;

  /// @param like  may be null; its analysis is used again when its branches join the same nodes
  FaultNetwork(const SequenceModel& model, int threads, const FaultNetwork* like);

  /// A block that a terminal is in, and where.
  struct Slot {
    std::uint32_t block = 0;
    std::uint32_t position = 0;
    bool used = false;
  };

  [[nodiscard]] const Inverse& inverse() const { return inverse_; }
  [[nodiscard]] const sparse::Factorisation<Complex, 3>& factors() const { return *factors_; }
  /// The element's own block, and the coupled group that the terminal is in.
  [[nodiscard]] const std::array<Slot, 2>& slots(std::uint32_t terminal) const { return slots_[terminal]; }
  /// The negative sequence has the same admittances as the positive one, bit for bit: one solution serves
  /// both.
  [[nodiscard]] bool negative_is_positive() const { return negative_is_positive_; }
  /// Puts the positive sequence of another model with the same buses, switches and branches into one lane of
  /// `values`, which has this network's pattern (made by empty_values).
  void put_positive(const SequenceModel& other, int lane, sparse::Values<Complex, 3>& values) const;
  [[nodiscard]] sparse::Values<Complex, 3> empty_values() const;
  /// The model's networks of reactances and resistances in this network's pattern: lanes X1, X0, R1, R0.
  [[nodiscard]] sparse::Values<double, 4> separate_values() const;
  [[nodiscard]] const std::shared_ptr<const sparse::Analysis>& analysis() const { return analysis_; }
  [[nodiscard]] const SolutionQuality& quality() const { return factors_->accuracy(); }

  /// Shares of a fault at `bus`, of all buses at most `depth` branches or closed switches away. Element
  /// currents follow from I_i = sum_j y_ij Z_jk over the element's terminals; those of closed switches from
  /// the balance at each bus.
  void reach(BusIndex bus, int depth, Reach& reach) const;

 private:
  /// A node that closed switches make of several buses.
  struct SwitchGroup {
    std::vector<std::uint32_t> switches;                        ///< into model.closed_switches
    std::vector<std::pair<std::uint32_t, std::uint32_t>> ends;  ///< positions in buses_of(node)
    std::vector<double> inverse;  ///< of the grounded Laplacian, (buses - 1)^2, row-major
  };

  void assemble(int threads, const FaultNetwork* like);
  template <typename Values>
  void pin(const std::vector<Node>& nodes, int lane, Values& values) const;
  void prepare_switches();
  [[nodiscard]] std::int32_t edge_between(Node a, Node b) const;
  [[nodiscard]] BySequence<Complex> z_to(Node j, Node k, const Reach& reach) const;
  [[nodiscard]] BySequence<Complex> share_of(std::uint32_t terminal, Node k, const Reach& reach) const;
  void add_terminal_shares(BusIndex bus, BusIndex fault_bus, Node k, Reach& reach) const;
  void add_induced_shares(Node k, Reach& reach) const;
  void add_switch_shares(BusIndex bus, BusIndex fault_bus, Node k, Reach& reach) const;
  [[nodiscard]] std::vector<BusIndex> buses_within(BusIndex bus, int depth) const;

  const SequenceModel* model_;
  std::vector<sparse::Edge> edges_;          ///< i < j, sorted
  std::vector<std::uint32_t> edge_start_;    ///< edges with i = n: [edge_start_[n], edge_start_[n + 1])
  std::vector<std::array<Slot, 2>> slots_;   ///< per terminal: its own block, and the coupled group it is in
  std::vector<std::int32_t> group_of_node_;  ///< into groups_, -1: a single bus
  std::vector<SwitchGroup> groups_;
  std::shared_ptr<const sparse::Analysis> analysis_;
  std::unique_ptr<sparse::Factorisation<Complex, 3>> factors_;
  Inverse inverse_;
  bool negative_is_positive_ = false;
};

}  // namespace kiloamp::detail
