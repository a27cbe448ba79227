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
  double ka = 0;                   ///< initial or first-cycle ac rms through the device
  double bus_ka = 0;               ///< of the whole fault
  FaultInTime* in_time = nullptr;  ///< IEC
  // C37 only
  double interrupting_ka = 0;
  double operating_kv = 0;  ///< prefault, line to line
};

struct Loading {
  double duty = 0, rating = 0;
  double through_ka = 0;
  std::optional<double> x_over_r, factor, nacd;
  std::string note;
  bool linear = true;  ///< duty grows in proportion to the current
  /// What chooses the governing fault; empty: duty over rating.
  std::optional<double> rank{};
  std::string undecided{};  ///< not empty: no verdict follows if this fault governs, and why
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
};

/// The rules of a device of the IEC family, and of the ANSI family.
[[nodiscard]] std::vector<Rule> iec_rules(const Device& device, const RuleFacts& facts);
[[nodiscard]] std::vector<Rule> c37_rules(const Device& device, const RuleFacts& facts);
/// Contact parting time that an IEC breaker asks the fault study for.
[[nodiscard]] std::optional<double> parting_time_s(const Device& device, double frequency_hz);
/// C37.010's simplified check of a high-voltage breaker, as a finding; empty for other devices.
[[nodiscard]] std::string simplified_finding(const Device& device, const Through& through);

}  // namespace kiloamp::detail
