#include <algorithm>
#include <functional>

#include "engine/network/judge.hpp"
#include "engine/network/terminals.hpp"

namespace kiloamp::detail {

namespace {

void judge_place(Findings& out, ElementRef ref, BusIndex bus, const std::optional<ElementRef>& branch) {
  if (!branch) return;
  const auto buses = buses_of(out.network(), *branch);
  if (std::find(buses.begin(), buses.end(), bus) == buses.end())
    out.error(ref, "branch",
              '"' + element(out.network(), *branch).id + "\" does not end at bus \"" +
                  out.network().bus(bus).id + '"',
              "the branch must be connected to the bus", "correct bus or branch");
}

// What each section may hold, first to last.
struct Section {
  std::initializer_list<DeviceStandard> standards;
  const char* words;
};
using S = DeviceStandard;
const Section kOfBreakers{
    {S::iec62271_100, S::iec62271_103, S::iec60947_2, S::iec60947_3, S::c37_total_current, S::c37_k_factor,
     S::c37_constant_ka, S::c37_13, S::ul489},
    "iec62271-100, iec62271-103, iec60947-2, iec60947-3, c37-total-current, c37-k-factor, "
    "c37-constant-ka, c37.13 or ul489"};
const Section kOfFuses{{S::iec60282_1, S::iec60269, S::c37_41, S::ul248},
                       "iec60282-1, iec60269, c37.41 or ul248"};
const Section kOfSwitchboards{{S::iec62271_200, S::iec61439, S::c37_20}, "iec62271-200, iec61439 or c37.20"};

// False: another section's, and its figures say nothing here.
bool judge_standard(Findings& out, ElementRef ref, const Device& d, const Section& section) {
  if (std::find(section.standards.begin(), section.standards.end(), d.standard) != section.standards.end())
    return true;
  out.error(ref, "standard", std::string("not one for a ") + kind_name(ref.kind),
            std::string("must be ") + section.words, "correct it, or move the device to the right section");
  return false;
}

// Which figures of a plate belong to which standards; another standard would leave them unread.
struct Figure {
  const char* field;
  std::optional<double> Device::*value;
  std::initializer_list<DeviceStandard> standards;
};
const Figure kFigures[] = {
    {"breaking_ka", &Device::breaking_ka, {S::iec62271_100, S::iec60282_1, S::iec60269}},
    {"making_peak_ka", &Device::making_peak_ka, {S::iec62271_100, S::iec62271_103}},
    {"short_time_ka",
     &Device::short_time_ka,
     {S::iec62271_100, S::iec62271_103, S::iec62271_200, S::iec61439, S::c37_total_current, S::c37_k_factor,
      S::c37_constant_ka, S::c37_13, S::c37_20}},
    {"short_time_s", &Device::short_time_s, {S::iec62271_100, S::iec62271_103, S::iec62271_200, S::iec61439}},
    {"dc_time_constant_ms", &Device::dc_time_constant_ms, {S::iec62271_100, S::c37_constant_ka}},
    {"opening_time_s", &Device::opening_time_s, {S::iec62271_100}},
    {"icu_ka", &Device::icu_ka, {S::iec60947_2}},
    {"ics_ka", &Device::ics_ka, {S::iec60947_2}},
    {"icm_ka", &Device::icm_ka, {S::iec60947_2, S::iec60947_3}},
    {"icw_ka", &Device::icw_ka, {S::iec60947_2, S::iec60947_3}},
    {"icw_s", &Device::icw_s, {S::iec60947_2, S::iec60947_3}},
    {"k_factor", &Device::k_factor, {S::c37_k_factor}},
    {"interrupting_mva", &Device::interrupting_mva, {S::c37_total_current}},
    {"interrupting_ka",
     &Device::interrupting_ka,
     {S::c37_total_current, S::c37_k_factor, S::c37_constant_ka, S::c37_13, S::ul489, S::c37_41, S::ul248}},
    {"close_latch_rms_ka", &Device::close_latch_rms_ka, {S::c37_total_current, S::c37_k_factor}},
    {"close_latch_peak_ka", &Device::close_latch_peak_ka, {S::c37_k_factor, S::c37_constant_ka}},
    {"interrupting_time_cycles",
     &Device::interrupting_time_cycles,
     {S::c37_total_current, S::c37_k_factor, S::c37_constant_ka}},
    {"contact_parting_cycles",
     &Device::contact_parting_cycles,
     {S::c37_total_current, S::c37_k_factor, S::c37_constant_ka}},
    {"test_power_factor", &Device::test_power_factor, {S::c37_13, S::ul489, S::c37_41, S::ul248}}};

void judge_figures(Findings& out, ElementRef ref, const Device& d) {
  const auto foreign = [&](const char* field) {
    out.error(ref, field, "not a figure of this standard", "would not be used",
              "delete it or correct the standard; to keep it as your own let its name begin with x_");
  };
  const auto is_one_of = [&](std::initializer_list<DeviceStandard> standards) {
    return std::find(standards.begin(), standards.end(), d.standard) != standards.end();
  };
  for (const Figure& figure : kFigures)
    if (d.*figure.value && !is_one_of(figure.standards)) foreign(figure.field);
  if (d.instantaneous_trip && !is_one_of({S::iec60947_2, S::c37_13})) foreign("instantaneous_trip");
  if (d.fused && d.standard != S::c37_13) foreign("fused");
  if ((d.local_curve_x_over_r || d.local_curve_factor) &&
      !is_one_of({S::c37_total_current, S::c37_k_factor, S::c37_constant_ka}))
    foreign("local_curve_x_over_r, local_curve_factor");
}

// Pairs of figures of which one may not be above the other.
void judge_order(Findings& out, ElementRef ref, const char* fields, const std::optional<double>& less,
                 const std::optional<double>& more, const char* allowed) {
  if (less && more && *less > *more)
    out.error(ref, fields, number_text(*less) + " and " + number_text(*more), allowed,
              "check which figure of the plate is which");
}

void judge_contradictions(Findings& out, ElementRef ref, const Device& d) {
  judge_order(out, ref, "ics_ka, icu_ka", d.ics_ka, d.icu_ka,
              "service breaking capacity is at most the ultimate one");
  judge_order(out, ref, "icu_ka, icm_ka", d.icu_ka, d.icm_ka,
              "a making current is a crest, above the rms it belongs to");
  judge_order(out, ref, "breaking_ka, making_peak_ka", d.breaking_ka, d.making_peak_ka,
              "a making current is a crest, above the rms it belongs to");
  judge_order(out, ref, "short_time_ka, peak_withstand_ka", d.short_time_ka, d.peak_withstand_ka,
              "a peak is above the rms it belongs to");
  judge_order(out, ref, "contact_parting_cycles, interrupting_time_cycles", d.contact_parting_cycles,
              d.interrupting_time_cycles, "contacts part before the current is interrupted");
}

// Standards for devices up to 1 kV (1.2 kV at most): their ratings say nothing above.
void judge_voltage_class(Findings& out, ElementRef ref, const Device& d) {
  const bool low_voltage = d.standard == S::iec60947_2 || d.standard == S::iec60947_3 ||
                           d.standard == S::iec61439 || d.standard == S::iec60269 ||
                           d.standard == S::c37_13 || d.standard == S::ul489 || d.standard == S::ul248;
  constexpr double kMost_kv = 1.2;
  const double nominal = out.network().bus(d.bus).nominal_kv;
  if (low_voltage && nominal > kMost_kv)
    out.error(ref, "standard",
              "one for low voltage at bus \"" + out.network().bus(d.bus).id + "\" of " +
                  number_text(nominal) + " kV",
              "must be a standard for the voltage of its bus", "correct standard or bus");
}

// K = highest over lowest voltage at which the capability rises with falling voltage; rated voltages are
// rounded.
constexpr double kRoundedPlate = 0.995;

void judge_voltage_range(Findings& out, ElementRef ref, const Device& d) {
  if (d.standard != S::c37_k_factor || !d.rated_kv || !d.k_factor) return;
  if (*d.k_factor < 1) {
    out.error(ref, "k_factor", number_text(*d.k_factor), "must be at least 1",
              "K is the highest over the lowest voltage of the breaker's range");
    return;
  }
  const double nominal = out.network().bus(d.bus).nominal_kv, lowest = *d.rated_kv / *d.k_factor;
  if (nominal < lowest * kRoundedPlate)
    out.error(ref, "rated_kv, k_factor",
              number_text(*d.rated_kv) + " and " + number_text(*d.k_factor) + " at bus \"" +
                  out.network().bus(d.bus).id + "\" of " + number_text(nominal) + " kV",
              "the bus must lie within the breaker's voltage range, rated_kv / K to rated_kv",
              "check the plate; below the range the breaker states no capability");
}

void judge_local_curve(Findings& out, ElementRef ref, const Device& d) {
  if (!d.local_curve_x_over_r && !d.local_curve_factor) return;
  const std::vector<double> none;
  const auto &x = d.local_curve_x_over_r ? *d.local_curve_x_over_r : none,
             &factor = d.local_curve_factor ? *d.local_curve_factor : none;
  const bool ascending = std::adjacent_find(x.begin(), x.end(), std::greater_equal<>()) == x.end();
  if (x.size() != factor.size() || x.size() < 2 || !ascending)
    out.error(ref, "local_curve_x_over_r, local_curve_factor",
              std::to_string(x.size()) + " and " + std::to_string(factor.size()) + " points" +
                  (ascending ? "" : ", X/R not ascending"),
              "must be at least two points, as many factors as X/R, X/R ascending",
              "read the points from the curve of the standard in order");
}

void judge_ratings(Findings& out, ElementRef ref, const Device& d) {
  judge_figures(out, ref, d);
  judge_contradictions(out, ref, d);
  judge_voltage_class(out, ref, d);
  judge_voltage_range(out, ref, d);
  judge_local_curve(out, ref, d);
  const double nominal = out.network().bus(d.bus).nominal_kv;
  if (d.rated_kv && nominal > 0 && *d.rated_kv < nominal)
    out.error(ref, "rated_kv",
              number_text(*d.rated_kv) + " at bus \"" + out.network().bus(d.bus).id + "\" of " +
                  number_text(nominal) + " kV",
              "must not be below the voltage of its bus",
              "check the plate: rated voltage is the highest the device may see");
}

}  // namespace

void judge_devices(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.breakers.size(); ++i) {
    if (!out.judges({ElementKind::breaker, i})) continue;
    judge_place(out, {ElementKind::breaker, i}, n.breakers[i].bus, n.breakers[i].branch);
    if (judge_standard(out, {ElementKind::breaker, i}, n.breakers[i], kOfBreakers))
      judge_ratings(out, {ElementKind::breaker, i}, n.breakers[i]);
  }
  for (std::uint32_t i = 0; i < n.fuses.size(); ++i) {
    if (!out.judges({ElementKind::fuse, i})) continue;
    judge_place(out, {ElementKind::fuse, i}, n.fuses[i].bus, n.fuses[i].branch);
    if (judge_standard(out, {ElementKind::fuse, i}, n.fuses[i], kOfFuses))
      judge_ratings(out, {ElementKind::fuse, i}, n.fuses[i]);
  }
  for (std::uint32_t i = 0; i < n.switchboards.size(); ++i) {
    if (!out.judges({ElementKind::switchboard, i})) continue;
    if (judge_standard(out, {ElementKind::switchboard, i}, n.switchboards[i], kOfSwitchboards))
      judge_ratings(out, {ElementKind::switchboard, i}, n.switchboards[i]);
  }
  for (std::uint32_t i = 0; i < n.relays.size(); ++i)
    if (out.judges({ElementKind::relay, i}))
      judge_place(out, {ElementKind::relay, i}, n.relays[i].bus, n.relays[i].branch);
  for (std::uint32_t i = 0; i < n.scenarios.size(); ++i) {
    const Scenario& s = n.scenarios[i];
    const ElementRef ref{ElementKind::scenario, i};
    if (!out.judges(ref)) continue;
    for (const auto index : s.open)
      if (std::find(s.close.begin(), s.close.end(), index) != s.close.end())
        out.error(ref, "open, close", "both name \"" + n.switches[index].id + '"',
                  "a switch is open or closed in a scenario", "delete it from one list");
    for (const ElementRef element_ref : s.out)
      if (std::find(s.in.begin(), s.in.end(), element_ref) != s.in.end())
        out.error(ref, "out, in", "both name \"" + element(n, element_ref).id + '"',
                  "an element is out or in in a scenario", "delete it from one list");
  }
}

}  // namespace kiloamp::detail
