#include "engine/study/duty_rules.hpp"

#include <algorithm>
#include <cmath>

namespace kiloamp::detail {

namespace {

constexpr double kNoPart = 1e-6;  // of the whole: its phase is rounding

}  // namespace

std::optional<double> own_x_over_r(const FaultResult& fault, const BySequence<Complex>& part) {
  std::optional<double> most;
  // `angle` of the impedance that the whole current meets.
  const auto take = [&](double angle, Complex whole, Complex own) {
    if (!(std::abs(own) > kNoPart * std::abs(whole))) return;
    const double part_angle = angle + std::arg(whole / own);
    if (part_angle <= 0) return;
    const double largest = std::atan(kLargestElementXOverR);
    const double x_over_r = part_angle >= largest ? kLargestElementXOverR : std::tan(part_angle);
    most = std::max(most.value_or(0), x_over_r);
  };
  if (fault.z1_ohm && fault.z1_ohm->real() >= 0 && fault.z1_ohm->imag() > 0)
    take(std::arg(*fault.z1_ohm), fault.sequence_ka[kPositive], part[kPositive]);
  if (fault.fault.kind == FaultKind::line_to_ground && fault.x_over_r && *fault.x_over_r > 0)
    take(std::atan(*fault.x_over_r), to_phases(fault.sequence_ka)[0], to_phases(part)[0]);
  return most;
}

void require_rated_voltage(const Device& device, std::vector<Rule>& rules) {
  if (device.rated_kv) return;
  for (Rule& rule : rules) {
    if (!rule.missing.empty()) continue;
    rule.missing = "rated_kv";
    rule.evaluate = nullptr;
  }
}

}  // namespace kiloamp::detail
