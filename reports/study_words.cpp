#include "reports/study_words.hpp"

#include <algorithm>

#include "reports/number_text.hpp"

namespace kiloamp {

namespace {
std::string number(double value) {
  std::string out;
  append_shortest(out, value);
  return out;
}
}  // namespace

std::string case_kind_words(const StudyOptions& options) {
  return options.case_kind == CaseKind::max
             ? "max: largest currents (feeders at their max level, motors in, conductors at 20 degrees C)"
             : "min: smallest currents (feeders at their min level where given, motors out, conductors at "
               "their end temperature)";
}

std::string prefault_words(const Study& study) {
  const auto& choice = study.options().prefault;
  if (std::holds_alternative<PrefaultFlat>(choice)) return "1 pu of nominal at every bus";
  if (const auto* value = std::get_if<PrefaultValue>(&choice))
    return number(value->pu) + " pu of nominal at every bus";
  const Network& n = study.network();
  const auto own =
      std::count_if(n.buses.begin(), n.buses.end(), [](const Bus& b) { return b.prefault_pu.has_value(); });
  const std::string rest = n.prefault_pu ? number(*n.prefault_pu) + " pu of nominal (prefault_pu of the case)"
                                         : std::string("1 pu of nominal");
  if (own == 0) return rest + " at every bus";
  return "of the case at " + std::to_string(own) + (own == 1 ? " bus, " : " buses, ") + rest +
         " at the others";
}

std::string fault_impedance_words(const StudyOptions& o) {
  if (o.phase_ohm == Complex(0) && o.earth_ohm == Complex(0)) return "none: bolted";
  const auto words = [](Complex z) { return number(z.real()) + " + j" + number(z.imag()) + " ohm"; };
  return words(o.phase_ohm) + " in each faulted phase, " + words(o.earth_ohm) + " to earth";
}

const char* fault_short_name(FaultKind kind) {
  static constexpr const char* kNames[] = {"3ph", "LG", "LL", "LLG"};
  return kNames[static_cast<std::size_t>(kind)];
}

const char* fault_words(FaultKind kind) {
  static constexpr const char* kNames[] = {"three-phase", "line to ground on phase a",
                                           "line to line on b and c", "double line to ground on b and c"};
  return kNames[static_cast<std::size_t>(kind)];
}

double degrees(Complex value) {
  const double deg = std::arg(value) * 180 / 3.14159265358979323846;
  return deg <= -180 ? 180 : deg;
}

}  // namespace kiloamp
