// From a solved first-cycle fault to the quantities of ANSI/IEEE fault studies: three networks, X/R, NACD.
#pragma once
#include <memory>

#include "engine/fault/companion_networks.hpp"
#include "engine/fault/separate_networks.hpp"
#include "engine/network/state.hpp"
#include "engine/standard/ieee_c37/machine_reactances.hpp"

namespace kiloamp::ieee_c37 {

struct Options {
  SmallMotors small_motors = SmallMotors::combined;
};

/// One fault in one network. Currents are ac rms in kA.
struct NetworkCurrent {
  double ez_ka = 0;                        ///< E/Z: largest phase current of the complex network
  double ex_ka = 0;                        ///< E/X: the same of the network of reactances alone
  std::optional<double> x_over_r;          ///< of the separate networks; empty: not both positive
  std::optional<double> complex_x_over_r;  ///< of the complex impedance, to compare
};

struct Quantities {
  NetworkCurrent first_cycle, interrupting;
  std::optional<double> asymmetric_ka, crest_ka;  ///< first cycle: total rms at half a cycle, largest crest
  /// Remote share of the interrupting current, by positive sequence: 1 without ac decay.
  double nacd = 1;
  std::optional<double> delayed_ka;  ///< E/Z after about 30 cycles; empty: see Evaluation::notes
};

/// The interrupting and the delayed network beside the first-cycle one, the separate networks of the first
/// two, and the sources whose current decays.
///
/// NACD = |share of utilities and remote generators|, share_j = y_j Z_jk. A generator is local to a fault
/// that its current reaches through at most one transformer and with more than 0.4 of its terminal value;
/// motors are local always. Source: IEEE C37.010, IEEE 551-2006 (from memory).
class Evaluation {
 public:
  /// @param given  the state of the study before any factor; needed during construction only
  /// @param first_cycle  solves the network with the first-cycle reactances, built with separate parts;
  /// outlives
  ///        this
  /// @param prefault per bus, as first_cycle has it
  Evaluation(const Network& given, const FaultSolver& first_cycle, const std::vector<Prefault>& prefault,
             const SequenceOptions& sequence, const Options& options, int threads);

  [[nodiscard]] Quantities of(const FaultResult& first_cycle) const;
  [[nodiscard]] const FaultSolver& interrupting() const { return interrupting_.solver(); }
  /// Null: a generator lacks X'd.
  [[nodiscard]] const FaultSolver* delayed() const { return delayed_ ? &delayed_->solver() : nullptr; }
  [[nodiscard]] const SeparateNetworks& separate(DutyNetwork which) const {
    return which == DutyNetwork::first_cycle ? first_cycle_separate_ : *interrupting_.separate;
  }
  [[nodiscard]] double nacd(BusIndex bus) const { return nacd_[at(bus)]; }
  [[nodiscard]] const std::vector<MachineReactance>& reactances(DutyNetwork which) const {
    return reactances_[static_cast<std::size_t>(which)];
  }
  [[nodiscard]] const std::vector<std::string>& notes() const { return notes_; }

 private:
  /// A network of its own: model and solution do not move, they refer to each other.
  struct Solved {
    std::unique_ptr<const SequenceModel> model;
    std::unique_ptr<const FaultSolver> solver_;
    std::unique_ptr<const SeparateNetworks> separate;
    [[nodiscard]] const FaultSolver& solver() const { return *solver_; }
  };
  [[nodiscard]] Solved solve(const Network& given, DutyNetwork which, const std::vector<Prefault>& prefault,
                             const SequenceOptions& sequence, int threads) const;
  void find_nacd(const Network& given, int threads);
  [[nodiscard]] NetworkCurrent current(const Fault& fault, const FaultSolver& solver,
                                       const SeparateNetworks& separate) const;

  const FaultSolver* first_cycle_;
  std::array<std::vector<MachineReactance>, 3> reactances_;
  SeparateNetworks first_cycle_separate_;
  Solved interrupting_;
  std::optional<Solved> delayed_;
  std::vector<double> nacd_;  ///< per bus
  std::vector<std::string> notes_;
};

/// X/R by separate networks and by the complex impedance differ by more than a tenth: a reviewer asks why.
[[nodiscard]] bool x_over_r_differ(const NetworkCurrent& current);

}  // namespace kiloamp::ieee_c37
