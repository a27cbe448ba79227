#include "engine/study/cross_check.hpp"

#include <algorithm>
#include <cmath>

#include "engine/phase/phase_network.hpp"

namespace kiloamp {

namespace {

// Below this part of V/1 ohm a fault current is round-off (an unearthed network), and differences are taken
// against it.
constexpr double kSmallestReference = 1e-6;

phase::PhaseFault wired(const Fault& fault, double prefault_ln_kv) {
  phase::PhaseFault wired;
  wired.bus = fault.bus;
  wired.phase_impedance_ohm = fault.phase_ohm;
  wired.earth_impedance_ohm = fault.earth_ohm;
  wired.prefault_ln_kv = prefault_ln_kv;
  wired.faulted = {true, true, true};
  if (fault.kind == FaultKind::line_to_ground) wired.faulted = {true, false, false};
  if (fault.kind == FaultKind::line_to_line || fault.kind == FaultKind::double_line_to_ground)
    wired.faulted = {false, true, true};
  wired.earthed = fault.kind == FaultKind::line_to_ground || fault.kind == FaultKind::double_line_to_ground;
  return wired;
}

double difference(const std::array<Complex, 3>& a, const std::array<Complex, 3>& b) {
  double largest = 0;
  for (int p = 0; p < 3; ++p) {
    const double d = std::abs(a[p] - b[p]);
    if (!(d <= largest)) largest = d;  // keeps a NaN
  }
  return largest;
}

class Comparison {
 public:
  Comparison(const Study& study, CrossCheck& check) : study_(study), check_(check) {}

  void compare(const FaultResult& result, const phase::PhaseSolution& solution) {
    ++check_.faults;
    const double reference_ka = std::max(result.current_ka, kSmallestReference * result.prefault_kv);
    note(difference(to_phases(result.sequence_ka), solution.fault_current_ka) / reference_ka, result,
         "fault current");
    for (const Contribution& c : result.contributions) {
      std::array<Complex, 3> other{};
      for (const auto& wired : solution.contributions)
        if (wired.element == c.element && wired.bus == c.bus)
          for (int p = 0; p < 3; ++p) other[p] += wired.current_ka[p];
      note(difference(to_phases(c.sequence_ka), other) / reference_ka, result,
           "contribution of " + element(study_.network(), c.element).id);
    }
    for (const BusVoltage& v : result.voltages) {
      const double kv = study_.model().nominal_kv[at(v.bus)] / std::sqrt(3.0);
      note(difference(to_phases(change(v, result)), solution.voltage_change_kv[at(v.bus)]) / kv, result,
           "voltage at " + study_.network().bus(v.bus).id);
    }
  }

 private:
  // What the fault adds to the prefault voltage, which has positive sequence only.
  [[nodiscard]] BySequence<Complex> change(const BusVoltage& v, const FaultResult& result) const {
    BySequence<Complex> change = v.sequence_kv;
    change[kPositive] -= study_.solver().prefault_kv(v.bus, result.fault.bus);
    return change;
  }
  void note(double relative, const FaultResult& result, std::string quantity) {
    if (relative <= check_.largest) return;
    check_.largest = std::isnan(relative) ? HUGE_VAL : relative;
    check_.bus = result.fault.bus;
    check_.kind = result.fault.kind;
    check_.quantity = std::move(quantity);
  }

  const Study& study_;
  CrossCheck& check_;
};

}  // namespace

CrossCheck cross_check(const Study& study) {
  const phase::PhaseNetwork network(study.network(), study.options().include_shunts);
  CrossCheck check;
  Comparison comparison(study, check);
  study.for_each_fault([&](const StudiedFault& studied) {
    const FaultResult& result = studied.result;
    if (result.has_source && !studied.inside_unit)
      comparison.compare(result, network.solve(wired(result.fault, result.prefault_kv)));
  });
  return check;
}

}  // namespace kiloamp
