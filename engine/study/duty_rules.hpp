// What each standard compares: one rule per rating of a device.
#pragma once
#include <variant>

#include "engine/study/duty.hpp"

namespace kiloamp::detail {

/// Ib and i_dc of one fault at the times that devices ask for; each is computed once.
class FaultInTime {
 public:
  explicit FaultInTime(const StudiedFault& fault) : fault_(&fault) {}
  [[nodiscard]] const iec60909::AtTime& at(double t_s);

 private:
  const StudiedFault* fault_;
  std::vector<std::pair<double, iec60909::AtTime>> known_;
};

/// Current through a device for one fault, and what the method says of the fault.
struct Through {
  FaultKind kind = FaultKind::three_phase;
  DutySide side = DutySide::total;
  const StudiedFault* fault = nullptr;
  double ka = 0;  ///< initial or first-cycle ac rms through the device
  /// X/R of the part that flows, from its phase against the driving voltage; empty: it is the whole, or says
  /// nothing. Where it is above that of the whole fault, it decides dc and peak.
  std::optional<double> own_x_over_r;
  double bus_ka = 0;               ///< of the whole fault
  FaultInTime* in_time = nullptr;  ///< IEC
  // C37 only
  double interrupting_ka = 0;
  std::optional<double> own_interrupting_x_over_r;
  double operating_kv = 0;      ///< prefault, line to line
  bool in_switch_loop = false;  ///< its coupler has closed ways beside it
  /// Current of this kind of fault over that of the three-phase one: how much more of it a three-phase source
  /// adds at most.
  double of_three_phase = 1;
};

struct Loading {
  double duty = 0, rating = 0;
  double through_ka = 0;
  std::optional<double> x_over_r, factor, nacd;
  std::string note;
  bool linear = true;  ///< duty grows in proportion to the current
  /// What chooses the governing fault; empty: duty over rating.
  std::optional<double> rank{};
  std::string undecided{};    ///< not empty: no verdict follows if this fault governs, and why
  bool interrupting = false;  ///< through_ka is that of C37's interrupting network
};
/// A loading, or why there is none.
using Outcome = std::variant<Loading, std::string>;

struct Rule {
  DutyQuantity quantity = DutyQuantity::breaking;
  std::string missing;  ///< not empty: the rating cannot be judged for want of this
  std::function<Outcome(const Through&)> evaluate;
};

struct RuleFacts {
  double frequency_hz = 50;
  double duration_s = 1;
  /// R/X for the peak of the machine at whose terminals the device stands (IEC 60909-0, 6.6.1); empty
  /// elsewhere.
  std::optional<double> machine_r_over_x;
};

/// X/R of a part of a fault's current: the angle of Z1 at the fault and how much the part's positive sequence
/// lags the whole's; on line to ground also the loop's angle and the lag in phase a, the larger of both. For
/// sources that meet at the fault alone it is exactly that of the part's path. A part that lags the voltage
/// by 90 degrees or more has kLargestElementXOverR. Empty: no current to speak of, or the part is not
/// inductive.
[[nodiscard]] std::optional<double> own_x_over_r(const FaultResult& fault, const BySequence<Complex>& part);

/// Rules without a rated voltage cannot be judged.
void require_rated_voltage(const Device& device, std::vector<Rule>& rules);

/// The rules of a device of the IEC family, and of the ANSI family.
[[nodiscard]] std::vector<Rule> iec_rules(const Device& device, const RuleFacts& facts);
[[nodiscard]] std::vector<Rule> c37_rules(const Device& device, const RuleFacts& facts);
/// Contact parting time that an IEC breaker asks the fault study for.
[[nodiscard]] std::optional<double> parting_time_s(const Device& device, double frequency_hz);
/// C37.010's simplified check of a high-voltage breaker, as a finding; empty for other devices.
[[nodiscard]] std::string simplified_finding(const Device& device, const Through& through);

}  // namespace kiloamp::detail
