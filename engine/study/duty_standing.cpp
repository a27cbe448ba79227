#include "engine/study/duty_standing.hpp"

#include <algorithm>
#include <cmath>

namespace kiloamp::detail {

namespace {

int badness(Verdict verdict) {
  switch (verdict) {
    case Verdict::over:
      return 3;
    case Verdict::not_evaluated:
      return 2;
    case Verdict::marginal:
      return 1;
    case Verdict::within:
      return 0;
  }
  return 0;
}

void set_verdict(DutyCheck& check, const Rule& rule, const Standing& standing, double marginal) {
  check.verdict = Verdict::not_evaluated;
  if (!rule.evaluate) {
    check.why = "missing: " + rule.missing;
  } else if (standing.loading < 0 && standing.blocked.empty()) {
    check.why = "no current through it in any state";
  } else if (!check.why.empty()) {
    return;
  } else if (check.has_duty() && check.margin() < 0) {
    check.verdict = Verdict::over;
  } else if (!standing.blocked.empty()) {
    check.why = standing.blocked;
  } else {
    check.verdict = check.margin() < marginal ? Verdict::marginal : Verdict::within;
  }
}

}  // namespace

DeviceDuty concluded(ElementRef device, const std::vector<Rule>& rules, DeviceStanding&& standing,
                     double nominal_kv, double marginal) {
  DeviceDuty duty{device, {}, Verdict::within, {}, {}, {}, {}};
  double most = -1;
  for (std::size_t r = 0; r < rules.size(); ++r) {
    DutyCheck check = standing.rules[r].check;
    check.quantity = rules[r].quantity;
    set_verdict(check, rules[r], standing.rules[r], marginal);
    // A dc percentage is judged beside the total current that it is part of.
    const bool governs = check.has_duty() && check.quantity != DutyQuantity::dc_component;
    if (governs && check.duty / check.rating > most) {
      most = check.duty / check.rating;
      duty.governing = r;
    }
    if (badness(check.verdict) > badness(duty.verdict)) duty.verdict = check.verdict;
    if (governs &&
        check.verdict == Verdict::over)  // also where more source at the bus is not what made it so
      standing.headroom_ka =
          std::min(standing.headroom_ka, check.through_ka * (check.rating / check.duty - 1));
    duty.checks.push_back(std::move(check));
  }
  if (std::isfinite(standing.headroom_ka))
    duty.headroom_mva = std::sqrt(3.0) * nominal_kv * standing.headroom_ka;
  if (!standing.finding.empty()) duty.findings.push_back(std::move(standing.finding));
  return duty;
}

void sort_worst_first(std::vector<DeviceDuty>& devices) {
  const auto loading = [](const DeviceDuty& d) {
    return d.governing ? 1 - d.checks[*d.governing].margin() : -1;
  };
  std::stable_sort(devices.begin(), devices.end(), [&](const auto& a, const auto& b) {
    return std::tuple(badness(a.verdict), loading(a)) > std::tuple(badness(b.verdict), loading(b));
  });
}

}  // namespace kiloamp::detail

namespace kiloamp {

const Device& device(const Network& network, ElementRef ref) {
  if (ref.kind == ElementKind::fuse) return network.fuses[ref.index];
  if (ref.kind == ElementKind::switchboard) return network.switchboards[ref.index];
  return network.breakers[ref.index];
}

std::string state_name(const Network& network, const DutyState& state) {
  std::string name = state.scenario ? network.scenarios[*state.scenario].id : "as written";
  if (!state.outage) return name;
  return (state.scenario ? name + " with " : "") + element(network, *state.outage).id +
         (state.outage->kind == ElementKind::bus_switch ? " open" : " out");
}

const char* verdict_name(Verdict verdict) {
  static constexpr const char* kNames[] = {"within", "marginal", "over", "not evaluated"};
  return kNames[static_cast<std::size_t>(verdict)];
}
const char* quantity_name(DutyQuantity quantity) {
  static constexpr const char* kNames[] = {"breaking",         "total breaking", "dc component",
                                           "service breaking", "making peak",    "close and latch",
                                           "short time",       "peak withstand"};
  return kNames[static_cast<std::size_t>(quantity)];
}
const char* side_name(DutySide side) {
  static constexpr const char* kNames[] = {"bus total", "fault beyond the device", "fault at the bus"};
  return kNames[static_cast<std::size_t>(side)];
}

}  // namespace kiloamp
