// How devices stand while states and faults go by, and what follows in the end.
#pragma once
#include <limits>

#include "engine/study/duty_rules.hpp"

namespace kiloamp::detail {

/// What is known of one rule of one device so far. Of equal loadings the first state, kind and side stay, so
// that the order of threads does not show.
struct Standing {
  double loading = -1;
  DutyCheck check;
  std::string blocked;  ///< why some fault could not be judged; of the first such state
  std::size_t blocked_state = SIZE_MAX;

  [[nodiscard]] auto order() const { return std::tuple(check.state, check.kind, check.side); }
  void merge(Standing&& other) {
    if (other.loading > loading || (other.loading == loading && other.order() < order())) {
      loading = other.loading;
      check = std::move(other.check);
    }
    if (other.blocked_state < blocked_state) {
      blocked = std::move(other.blocked);
      blocked_state = other.blocked_state;
    }
  }
};
/// What is known of one device.
struct DeviceStanding {
  std::vector<Standing> rules;
  double headroom_ka = std::numeric_limits<double>::infinity();  ///< of three-phase source
  std::string finding;  // of the simplified check, at its largest interrupting current
  double finding_ka = -1;
  std::size_t finding_state = SIZE_MAX;

  void merge(DeviceStanding&& other) {
    for (std::size_t r = 0; r < rules.size(); ++r) rules[r].merge(std::move(other.rules[r]));
    headroom_ka = std::min(headroom_ka, other.headroom_ka);
    if (other.finding_ka > finding_ka ||
        (other.finding_ka == finding_ka && other.finding_state < finding_state)) {
      finding = std::move(other.finding);
      finding_ka = other.finding_ka;
      finding_state = other.finding_state;
    }
  }
};

/// Verdicts, governing check and headroom of one device.
[[nodiscard]] DeviceDuty concluded(ElementRef device, const std::vector<Rule>& rules,
                                   DeviceStanding&& standing, double nominal_kv, double marginal);
/// Over, not evaluated, marginal, within; among equals the largest duty over rating first.
void sort_worst_first(std::vector<DeviceDuty>& devices);

}  // namespace kiloamp::detail
