// A network in one state, modelled and solved: what every study starts from.
#pragma once
#include <functional>
#include <string>
#include <variant>

#include "engine/fault/fault_solver.hpp"
#include "engine/network/finding.hpp"
#include "engine/standard/iec60909/quantities.hpp"
#include "engine/standard/ieee_c37/quantities.hpp"

namespace kiloamp {

/// Prefault voltages: as the case gives them (a bus's own, else the case's, else 1 pu), or 1 pu everywhere,
/// or one value everywhere.
struct PrefaultAsGiven {};
struct PrefaultFlat {};
struct PrefaultValue {
  double pu;
};
using PrefaultChoice = std::variant<PrefaultAsGiven, PrefaultFlat, PrefaultValue>;

/// Classical: voltage behind impedance, the case's impedances as they are. IEC 60909: equivalent voltage
/// source c Un / sqrt(3) at the fault, corrected impedances. C37: ANSI/IEEE, prefault voltage behind the
/// first-cycle reactances of machines, with the interrupting and the delayed network beside it.
enum class Method : std::uint8_t { classical, iec60909, c37 };

struct StudyOptions {
  Method method = Method::classical;
  iec60909::Options iec60909;
  ieee_c37::Options c37;
  CaseKind case_kind = CaseKind::max;
  std::optional<std::size_t> scenario;  ///< index in Network::scenarios
  PrefaultChoice prefault = PrefaultAsGiven{};
  bool include_shunts = false;
  bool judges_devices = false;  ///< the study's user does: no warning that devices are not judged
  std::vector<FaultKind> kinds{kAllFaults.begin(), kAllFaults.end()};
  std::vector<BusIndex> buses;  ///< empty: all buses in service
  /// IEC 60909: the power station unit between whose machine and transformer the faults lie.
  /// Study::inside_unit sets it for the buses where it is needed.
  std::optional<std::uint32_t> inside_unit;
  Complex phase_ohm = 0, earth_ohm = 0;
  FaultOptions fault;
  int threads = 1;
};

class Study;
/// A fault as the study's method sees it.
struct StudiedFault {
  const Study* study;  ///< that solved it
  const FaultResult& result;
  CaseKind case_kind = CaseKind::max;
  const iec60909::Quantities* iec60909 = nullptr;  ///< of that method
  const ieee_c37::Quantities* c37 = nullptr;       ///< of that method
  bool inside_unit = false;                        ///< solved with the factors for a fault inside a unit
  operator const FaultResult&() const { return result; }
};
using FaultVisit = std::function<void(const StudiedFault&)>;

/// Owns the network in the studied state, its model and the solved sequence networks. Not movable: the parts
/// refer to each other.
class Study {
 public:
  /// @param network  taken; given back, in the studied state, when the constructor throws
  /// @throws NetworkError            the state contradicts itself (loop of vector groups)
  /// @throws sparse::NumericalError  a sequence network cannot be solved
  Study(Network&& network, const StudyOptions& options);
  Study(const Study&) = delete;
  Study& operator=(const Study&) = delete;

  [[nodiscard]] const Network& network() const { return network_; }
  [[nodiscard]] const StudyOptions& options() const { return options_; }
  [[nodiscard]] const SequenceModel& model() const { return model_; }
  [[nodiscard]] const FaultSolver& solver() const { return *solver_; }
  [[nodiscard]] const std::vector<DefaultUse>& defaults_used() const { return defaults_; }
  /// What a reader must know besides the numbers: elements that the study leaves out, assumed zero-sequence
  /// data, buses without a source, loops of closed switches, a sequence whose equations needed a pivoting
  /// solution.
  [[nodiscard]] const std::vector<std::string>& warnings() const { return warnings_; }
  /// Wall time of the two parts of construction.
  struct Timing {
    double model_ms = 0;  ///< state, defaults, corrections, sequence networks
    double solution_ms =
        0;  ///< assembly, ordering, factors, selected inverse; companion networks of the method
  };
  [[nodiscard]] const Timing& timing() const { return timing_; }
  [[nodiscard]] const std::string& scenario_id() const { return scenario_id_; }

  /// IEC 60909: what was corrected, and what follows from a fault; null for another method.
  [[nodiscard]] const std::vector<iec60909::Correction>& corrections() const { return corrections_; }
  [[nodiscard]] const iec60909::Evaluation* iec60909() const { return evaluation_.get(); }
  /// C37: the networks beside the first-cycle one; null for another method.
  [[nodiscard]] const ieee_c37::Evaluation* c37() const { return c37_.get(); }
  /// A study of its own for a bus between machine and transformer of a power station unit, whose faults need
  /// factors of their own; null for every other bus.
  [[nodiscard]] std::unique_ptr<Study> inside_unit(BusIndex bus) const;
  /// The buses whose faults are wanted: those of the options, else all in service in the case's order.
  [[nodiscard]] const std::vector<BusIndex>& wanted_buses() const { return wanted_; }
  /// Solves every wanted fault, bus by bus and kind by kind, and hands each to `visit`; the result is only
  /// valid during the call. FaultLoop does the same for one bus at a time.
  void for_each_fault(const FaultVisit& visit) const;

 private:
  void prepare();
  void correct();
  [[nodiscard]] std::vector<ieee_c37::MachineReactance> first_cycle_reactances() const;
  void warn_of_x_over_r();
  void find_insides();

  Network network_;
  StudyOptions options_;
  std::string scenario_id_;
  std::vector<DefaultUse> defaults_;
  std::optional<Network> as_given_;
  std::vector<iec60909::Correction> corrections_;
  SequenceModel model_;
  std::unique_ptr<FaultSolver> solver_;
  std::unique_ptr<iec60909::Evaluation> evaluation_;
  std::unique_ptr<ieee_c37::Evaluation> c37_;
  std::vector<std::pair<Node, std::uint32_t>> inside_;  ///< nodes inside units, sorted
  std::vector<std::string> warnings_;
  std::vector<BusIndex> wanted_;
  Timing timing_;
};

/// One thread's way through the faults of a study. A bus inside a power station unit is solved in a network
/// of its own, with the factors that IEC 60909-0 has for it.
class FaultLoop {
 public:
  explicit FaultLoop(const Study& study) : study_(&study), workspace_(study.solver().make_workspace()) {}
  /// The wanted kinds of fault at one bus, in order; the result is only valid during the call.
  void at_bus(BusIndex bus, const FaultVisit& visit);

 private:
  const Study* study_;
  FaultSolver::WorkspacePtr workspace_;
  FaultResult result_;
};

/// The cautions that every report prints, in order. Source: common practice; standards named where a caution
/// quotes one.
[[nodiscard]] const std::vector<std::string>& cautions();

/// "three_phase", "line_to_ground", "line_to_line", "double_line_to_ground": the words of results.
[[nodiscard]] const char* fault_name(FaultKind kind);

}  // namespace kiloamp
