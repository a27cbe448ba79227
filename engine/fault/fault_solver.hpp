// Faults at any bus of a model: one factorisation and one selected inverse for all of them.
#pragma once
#include <memory>

#include "engine/fault/fault.hpp"
#include "engine/sparse/symmetric_system.hpp"

namespace kiloamp {

namespace detail {
class FaultNetwork;
}

/// Prefault voltage of a bus: magnitude and angle. Without an angle the bus follows its vector groups (no
/// load flow).
struct Prefault {
  double pu = 1.0;
  std::optional<double> deg;
};

struct FaultOptions {
  /// Voltages, branch currents and neutral currents of buses up to this many branches away. 0: the faulted
  /// bus.
  int depth = 0;
};

/// How well the equations of a sequence hold; see sparse::Accuracy.
using SolutionQuality = BySequence<sparse::Accuracy>;

/// Solves faults by superposition: Delta V = -Z I at every node, and each element's current from its own
/// admittances, I = y Delta V. Prefault load currents are not part of the result.
///
/// The model must outlive the solver. Solving is const and may run on several threads, each with a Workspace
/// of its own.
class FaultSolver {
 public:
  /// @throws sparse::NumericalError  a sequence network that cannot be solved (resonance); row() is a Node.
  /// @param like  a solver of a model whose branches join the same nodes: its ordering is used again
  FaultSolver(const SequenceModel& model, std::vector<Prefault> prefault_of_bus, int threads = 1,
              const FaultSolver* like = nullptr);
  ~FaultSolver();

  [[nodiscard]] const SequenceModel& model() const { return *model_; }
  [[nodiscard]] const SolutionQuality& quality() const;

  /// Z_kk per sequence at a bus in pu; empty z1: no source.
  [[nodiscard]] std::optional<TheveninData> thevenin_pu(BusIndex bus) const;

  /// The factorised networks, for studies that change them by low rank.
  [[nodiscard]] const detail::FaultNetwork& solved() const;
  [[nodiscard]] double prefault_pu(BusIndex bus) const;

  /// Prefault line-to-neutral voltage of `bus` when the prefault phase a of `reference` is at 0 degrees.
  [[nodiscard]] Complex prefault_kv(BusIndex bus, BusIndex reference) const;

  /// Scratch memory of one thread; what belongs to the place, not to the kind of fault, is kept between calls
  /// for one bus.
  class Workspace;
  struct WorkspaceDelete {
    void operator()(Workspace* w) const;
  };
  using WorkspacePtr = std::unique_ptr<Workspace, WorkspaceDelete>;
  [[nodiscard]] WorkspacePtr make_workspace() const;

  /// Fills `result` (its vectors are reused). A bus out of service has no source.
  void solve(const Fault& fault, const FaultOptions& options, Workspace& workspace,
             FaultResult& result) const;

 private:
  struct Body;
  const SequenceModel* model_;
  std::unique_ptr<Body> body_;
};

}  // namespace kiloamp
