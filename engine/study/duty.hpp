// What the network asks of every breaker, switch, fuse and switchboard, against what the device can do.
#pragma once
#include <functional>

#include "engine/study/study.hpp"

namespace kiloamp {

struct DutyOptions {
  /// Prefault voltage (C37), IEC and C37 options, shunts, threads; method, case kind and scenario are not
  /// read: a device is judged with the largest currents by its own family's method.
  StudyOptions study;
  /// Only devices of one family are judged; the others are reported as not evaluated. Empty: both.
  std::optional<DeviceFamily> family;
  /// Only this state. Empty: the case as written and every scenario.
  std::optional<std::size_t> scenario;
  /// Also each single outage of a feeder, machine, line, transformer (earthing ones too), reactor or closed
  /// coupler, from the case as written (or from `scenario`). Each is a network of its own, solved anew.
  bool outages = false;
  double marginal = 0.10;  ///< a margin below this part of the rating is marginal
  /// Called now and then from one thread with how many states are done.
  std::function<void(std::size_t done, std::size_t all)> progress;
};

enum class Verdict : std::uint8_t { within, marginal, over, not_evaluated };
/// "within", "marginal", "over", "not evaluated".
[[nodiscard]] const char* verdict_name(Verdict verdict);

enum class DutyQuantity : std::uint8_t {
  breaking,          ///< symmetrical current to be interrupted: at contact parting (IEC), adjusted (C37), Icu
  total_breaking,    ///< IEC: total rms at contact parting
  dc_component,      ///< IEC: percent of the crest of the ac component at contact parting
  service_breaking,  ///< Ics
  making_peak,       ///< crest to close on: IEC making current, close-and-latch crest
  close_latch_rms,   ///< C37: total rms of the first cycle
  short_time,        ///< rms for the rated duration
  peak_withstand     ///< crest through closed contacts or busbars
};
/// "breaking", "total breaking", ...
[[nodiscard]] const char* quantity_name(DutyQuantity quantity);
[[nodiscard]] constexpr const char* quantity_unit(DutyQuantity q) {
  return q == DutyQuantity::dc_component ? "%" : "kA";
}

/// Where the fault lies as the device sees it, hence which current flows through it.
enum class DutySide : std::uint8_t {
  total,   ///< device of the bus: everything
  beyond,  ///< fault on the branch's side of the device: everything but its own branch
  own      ///< fault at the bus: its own branch alone
};
/// "bus total", "fault beyond the device", "fault at the bus".
[[nodiscard]] const char* side_name(DutySide side);

struct DutyState {
  std::optional<std::size_t> scenario;  ///< empty: as written
  std::optional<ElementRef> outage;
};

/// One rating and the largest duty over states, kinds of fault and sides.
struct DutyCheck {
  DutyQuantity quantity = DutyQuantity::breaking;
  Verdict verdict = Verdict::not_evaluated;
  std::string why;  ///< of not_evaluated: the datum that is missing, or what has no value
  // What governs; meaningless when nothing was evaluated.
  double duty = 0, rating = 0;
  std::size_t state = 0;  ///< into DutyTable::states
  FaultKind kind = FaultKind::three_phase;
  DutySide side = DutySide::total;
  double through_ka = 0;  ///< ac rms through the device that the duty is made of
  std::optional<double> x_over_r, factor, nacd;
  bool interrupting = false;  ///< through_ka is that of C37's interrupting network, not of its first cycle
  std::string note;           ///< which way of the standard was taken, where there is a choice
  [[nodiscard]] bool has_duty() const { return rating > 0; }
  [[nodiscard]] double margin() const { return (rating - duty) / rating; }
};

/// A source's part of the current that governs a device.
struct DutyFeed {
  ElementRef source;
  double ka = 0, share = 0;
};

struct DeviceDuty {
  ElementRef device;
  std::vector<DutyCheck> checks;
  Verdict verdict = Verdict::not_evaluated;  ///< the worst: over, not evaluated, marginal, within
  std::optional<std::size_t> governing;      ///< the check with the largest duty over rating
  /// How much more three-phase source at its bus brings the device to its rating, at unchanged X/R and decay;
  /// negative: what flows through it is too much by that. Empty: no three-phase fault was evaluated.
  std::optional<double> headroom_mva;
  /// Of the governing check, at most five, largest first; by positive sequence, full converters left out.
  std::vector<DutyFeed> feeds;
  std::vector<std::string> findings;
};

struct DutyTable {
  std::vector<DutyState> states;
  std::vector<DeviceDuty> devices;     ///< worst verdict first, then the largest duty over rating
  std::array<std::size_t, 4> count{};  ///< devices per verdict
  std::vector<DefaultUse> defaults;
  std::vector<std::string> warnings;
  bool used_iec = false, used_c37 = false;
};

/// Every device in service in some state is judged, in the states where it is. A device on a branch carries
/// the larger of the bus total less its own branch (fault beyond it) and its own branch (fault at the bus),
/// each the largest phase of phasor sums; a device without branch the total, and so does one on a coupler
/// with closed ways beside it. IEC: I"k by IEC 60909-0, for a branch Ib = min(through I"k, total Ib), dc
/// percentage of the least ac that may be left. C37: first-cycle and interrupting E/Z. Peak, dc, thermal and
/// asymmetry factors are those of the whole fault (C37: X/R of the separate networks) or of the part by its
/// own phase, whichever is larger. Ratings and formulas: standard/switchgear and standard/ieee_c37.
///
/// The result does not depend on the number of threads.
/// @throws NetworkError, sparse::NumericalError  as Study, for any state
[[nodiscard]] DutyTable duty(const Network& network, const DutyOptions& options);

/// "as written", a scenario's id, "T1 out", "weak grid with T1 out".
[[nodiscard]] std::string state_name(const Network& network, const DutyState& state);

/// The device that `ref` (breaker, fuse or switchboard) names.
[[nodiscard]] const Device& device(const Network& network, ElementRef ref);

}  // namespace kiloamp
