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

const char* method_name(Method method) {
  static constexpr const char* kNames[] = {"classical", "iec60909", "c37"};
  return kNames[static_cast<std::size_t>(method)];
}

std::string method_words(const StudyOptions& o) {
  if (o.method == Method::classical) return "classical method (voltage behind impedance, no load currents)";
  if (o.method == Method::c37)
    return std::string("ANSI/IEEE C37.010, C37.13 and IEEE 551 (E/Z in three networks, ") +
           (o.c37.small_motors == ieee_c37::SmallMotors::combined
                ? "combined first-cycle network"
                : "motors below 50 hp out of the first cycle") +
           "; from memory of the standards' formulas)";
  return std::string("IEC 60909-0:") + (o.iec60909.edition == iec60909::Edition::e2016 ? "2016" : "2001") +
         " (equivalent voltage source, from memory of the standard's formulas)";
}

const char* case_kind_name(CaseKind kind) { return kind == CaseKind::max ? "max" : "min"; }

std::vector<std::string> warnings_of(const Studies& studies) {
  std::vector<std::string> all;
  for (const Study* study : studies)
    for (const std::string& warning : study->warnings()) {
      const bool common = std::all_of(studies.begin(), studies.end(), [&](const Study* other) {
        return std::count(other->warnings().begin(), other->warnings().end(), warning) > 0;
      });
      const std::string text =
          common ? warning : std::string(case_kind_name(study->options().case_kind)) + ": " + warning;
      if (std::count(all.begin(), all.end(), text) == 0) all.push_back(text);
    }
  return all;
}

std::string peak_words(const StudyOptions& o) {
  if (o.method == Method::classical)
    return "kappa sqrt(2) I with kappa = 1.02 + 0.98 exp(-3 R/X) (IEC 60909-0, 8.1), R/X of the loop "
           "impedance of the fault";
  if (o.method == Method::c37)
    return "crest = sqrt(2) (1 + exp(-2 pi t R/X)) E/Z, t = 0.49 - 0.1 exp(-X/3R) cycles (IEEE 551), X/R of "
           "the "
           "separate X and R networks";
  switch (o.iec60909.kappa) {
    case iec60909::KappaMethod::a:
      return "ip = kappa sqrt(2) I\"k, kappa by method (a): smallest R/X of the branches at the voltage "
             "level "
             "of the fault";
    case iec60909::KappaMethod::b:
      return "ip = kappa sqrt(2) I\"k, kappa by method (b): R/X at the fault, times 1.15 where a branch has "
             "R/X "
             "of 0.3 or more, at most 1.8 up to 1 kV and 2.0 above";
    case iec60909::KappaMethod::c:
      break;
  }
  return "ip = kappa sqrt(2) I\"k, kappa by method (c): R/X of the network at 0.4 times the frequency; that "
         "of "
         "the three-phase fault for every kind";
}

std::string case_kind_words(const StudyOptions& options) {
  if (options.method == Method::iec60909)
    return options.case_kind == CaseKind::max
               ? "max: c max, feeders at their max level, motors in, conductors at 20 degrees C"
           : options.iec60909.edition == iec60909::Edition::e2016
               ? "min: c min, feeders at their min level where given, motors and inverters out, conductors "
                 "at "
                 "their end temperature, correction factors 1"
               : "min: c min, feeders at their min level where given, motors and inverters out, conductors "
                 "at "
                 "their end temperature";
  return options.case_kind == CaseKind::max
             ? "max: largest currents (feeders at their max level, motors in, conductors at 20 degrees C)"
             : "min: smallest currents (feeders at their min level where given, motors out, conductors at "
               "their end temperature)";
}

std::string prefault_words(const Study& study) {
  if (study.options().method == Method::iec60909) {
    std::vector<double> factors;
    for (std::size_t b = 0; b < study.network().buses.size(); ++b)
      if (const double c = study.solver().prefault_pu(static_cast<BusIndex>(b));
          std::find(factors.begin(), factors.end(), c) == factors.end())
        factors.push_back(c);
    std::sort(factors.begin(), factors.end());
    std::string text = "c Un / sqrt(3) at the fault, c = ";
    for (std::size_t i = 0; i < factors.size(); ++i) text += (i > 0 ? ", " : "") + number(factors[i]);
    return text + " by the bus's nominal voltage and tolerance";
  }
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
