// From a solved fault to the quantities of IEC 60909-0: peak, breaking, steady-state and thermal current.
#pragma once
#include "engine/fault/companion_networks.hpp"
#include "engine/standard/iec60909/corrections.hpp"

namespace kiloamp::iec60909 {

/// How R/X for kappa is found in a meshed network (clause 8): (a) smallest R/X of the branches at the voltage
/// level of the fault, (b) R/X at the fault with 1.15 kappa, (c) equivalent frequency, 20 Hz of 50 or 24
/// of 60.
enum class KappaMethod : std::uint8_t { a, b, c };

struct Options {
  Edition edition = Edition::e2016;
  KappaMethod kappa = KappaMethod::c;
  double tmin_s = 0.1;    ///< minimum time delay, for Ib and i_dc
  double duration_s = 1;  ///< Tk, for Ith
  /// Times at which Evaluation::at_time will be asked: contact parting times of devices.
  std::vector<double> parting_s;
};

/// A quantity without a value, and the figure that it lacks.
struct NotEvaluated {
  std::string quantity, why;
};

/// A machine near the fault: what it adds and how that decays until tmin.
struct MachinePart {
  ElementRef element;
  double ikss_ka = 0;  ///< I"kG or I"kM at its terminals
  double ratio = 0;    ///< I"kG / I_rG
  double mu = 1;
  std::optional<double> q;  ///< of an asynchronous motor
};

/// Ib and i_dc at one time; an empty one is explained in not_evaluated.
struct AtTime {
  std::optional<double> ib_ka, idc_ka;
  std::vector<MachinePart> machines;  ///< three-phase only
  std::vector<NotEvaluated> not_evaluated;
};

/// Currents are rms in kA but for ip_ka and idc_ka. Unbalanced faults: kappa is that of the three-phase fault
/// (clause 8 allows it), Ib = Ik = I"k (9.2, 11.5, from memory).
struct Quantities {
  double c = 1;             ///< voltage factor at the bus
  double ikss_ka = 0;       ///< I"k, converters included
  double converter_ka = 0;  ///< part of full converters: I"k (1/e) sum |Z_ij| I_kPF,j (6.9, from memory)
  double skss_mva = 0;      ///< S"k = sqrt(3) Un I"k
  std::optional<double> r_over_x, kappa, ip_ka;  ///< ip = kappa sqrt(2) I"k
  std::optional<double> ib_ka, idc_ka;           ///< at tmin
  std::optional<double> ib_asymmetric_ka;        ///< sqrt(Ib^2 + i_dc^2)
  std::optional<double> ik_ka, ith_ka, m, n, i2t_ka2s;
  /// Three-phase only: how much the asynchronous motors raise I"k, against I"k without them. At most 5 %
  /// would allow to neglect them (6.10); they are not.
  std::optional<double> motor_share_percent;
  std::vector<NotEvaluated> not_evaluated;
  std::vector<MachinePart> machines;  ///< three-phase only
};

/// A rule of 6.10 that would allow to neglect motors, evaluated; nothing is neglected.
struct MotorRule {
  ElementRef place;  ///< a bus up to 1 kV, or a transformer with motors at its lower-voltage side
  double value = 0, limit = 0;
  [[nodiscard]] bool would_allow() const { return value <= limit; }
};

/// Three companion networks (method (c), no motors, i_dc at tmin) and the machines near each bus.
///
/// Ib of a three-phase fault is that of a meshed network (9.1.4), which contains the radial one:
///   Ib = |I"k - sum dU"G / e (1 - mu) I"kG - sum dU"M / e (1 - mu q) I"kM|, dU" = j X" I",
/// complex, with the machine's own corrected X". A machine with I"k / Ir up to 2 has mu = 1 and no q; those
/// left out of the sum are proven to be such (NearSources). Drives and motors count as the standard has them:
/// a drive gives nothing to Ib and Ik. Ik is I"k without motors (meshed rule, 11.2.4); at the terminals of a
/// machine with lambda_max or lambda_min its part is lambda Ir, with static excitation fed from them 0. Ith =
/// I"k sqrt(m + n), n = 1 for I"k / Ik below 1.25: annex A has its formula from there on.
///
/// Source: IEC 60909-0:2016, clauses named, from memory.
class Evaluation {
 public:
  /// All of them as the study solved them, and alive as long as this.
  Evaluation(const Network& corrected, const FaultSolver& solver, const Options& options, CaseKind kind,
             int threads);

  [[nodiscard]] Quantities of(const FaultResult& fault) const;
  /// The same fault at another time, which is tmin or one of Options::parting_s.
  [[nodiscard]] AtTime at_time(const FaultResult& fault, double t_s) const;
  [[nodiscard]] const std::vector<MotorRule>& motor_rules() const { return motor_rules_; }
  /// What a reader must know: converters taken as constant currents or left out.
  [[nodiscard]] const std::vector<std::string>& notes() const { return notes_; }

 private:
  struct Machine {
    ElementRef element;
    BusIndex bus;
    Node node = Node::none;
    Complex y_pu = 0;     ///< corrected
    double rated_pu = 0;  ///< Ir
    double rated_ka = 0;
    bool motor = false;  ///< asynchronous
    bool drive = false;
    std::optional<double> mw_per_pole_pair{};
  };

  void build_companions(int threads);
  [[nodiscard]] std::optional<Complex> dc_impedance_pu(double ratio, BusIndex bus) const;
  [[nodiscard]] double converter_ka(const FaultResult& fault) const;
  void collect_machines();
  void find_converters();
  void find_branch_ratios();
  void judge_motor_rules();
  void peak(const FaultResult& fault, Quantities& q) const;
  [[nodiscard]] std::optional<double> breaking_ka(const FaultResult& fault, double t_s, AtTime& result) const;
  void steady(const FaultResult& fault, Quantities& q) const;
  void thermal(Quantities& q) const;
  [[nodiscard]] double initial_ka(Complex z_pu, BusIndex bus) const;

  const Network* network_;
  const FaultSolver* solver_;
  Options options_;
  CaseKind kind_;
  std::optional<CompanionNetworks> companions_;   ///< at the peak, without motors, i_dc at tmin
  std::vector<double> dc_ratios_;                 ///< frequency ratios of i_dc: tmin's first where it has one
  std::vector<CompanionNetworks> dc_companions_;  ///< for those that companions_ has no room for
  std::vector<Machine> machines_;
  std::vector<std::vector<std::uint32_t>> machines_at_node_;
  std::optional<NearSources> near_;
  std::vector<double> converter_pu_;  ///< per node: sum |Z_ij| I_j; empty without converters
  struct BranchRatios {
    double smallest_of_level = 0;  ///< R/X over the branches of the island at the node's voltage level
    double largest_of_island = 0;
  };
  std::vector<BranchRatios> ratios_;  ///< per node; empty for method (c)
  std::vector<MotorRule> motor_rules_;
  std::vector<std::string> notes_;
};

}  // namespace kiloamp::iec60909
