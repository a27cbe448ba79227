#include <cmath>

#include "engine/standard/switchgear/iec_ratings.hpp"
#include "engine/study/duty_rules.hpp"
#include "engine/study/rounded_text.hpp"

namespace kiloamp::detail {

namespace {

using namespace switchgear;

// What the total at the bus has, in the proportion of the device's part.
Outcome in_proportion(const Through& t, const std::optional<double>& of_total_ka, double rating,
                      const char* why) {
  if (!of_total_ka) return std::string(why);
  const double factor = t.bus_ka > 0 ? *of_total_ka / t.bus_ka : 0;
  return Loading{t.ka * factor, rating, t.ka, std::nullopt, factor, std::nullopt, {}};
}

std::string why_not(const iec60909::AtTime& at, const char* quantity) {
  for (const iec60909::NotEvaluated& none : at.not_evaluated)
    if (none.quantity == quantity) return std::string(quantity) + ": " + none.why;
  return std::string(quantity) + " has no value";
}

// No decay is credited to a part of the current; the part is not above the total that remains.
double symmetrical_at(const Through& t, double total_ib_ka) {
  return t.side == DutySide::total ? total_ib_ka : std::min(t.ka, total_ib_ka);
}

void add_short_time(std::vector<Rule>& rules, const std::optional<double>& rated_ka, const char* ka_field,
                    const std::optional<double>& rated_s, const char* s_field, const RuleFacts& facts) {
  Rule rule{DutyQuantity::short_time, {}, {}};
  if (!rated_ka)
    rule.missing = ka_field;
  else if (!rated_s)
    rule.missing = s_field;
  else
    rule.evaluate = [rating = withstand_ka(*rated_ka, *rated_s, facts.duration_s)](const Through& t) {
      return in_proportion(t, t.fault->iec60909->ith_ka, rating,
                           "Ith has no value: see the notes of the study");
    };
  rules.push_back(std::move(rule));
}

void add_peak(std::vector<Rule>& rules, DutyQuantity quantity, const std::optional<double>& rated_ka,
              const std::string& missing, std::string note = {}) {
  Rule rule{quantity, {}, {}};
  if (!rated_ka)
    rule.missing = missing;
  else
    rule.evaluate = [rating = *rated_ka, note = std::move(note)](const Through& t) {
      Outcome outcome = in_proportion(t, t.fault->iec60909->ip_ka, rating,
                                      "ip has no value: the impedance is not inductive");
      if (auto* loading = std::get_if<Loading>(&outcome)) {
        loading->note = note;
        if (const auto rx = t.fault->iec60909->r_over_x; rx && *rx > 0) loading->x_over_r = 1 / *rx;
      }
      return outcome;
    };
  rules.push_back(std::move(rule));
}

void add_high_voltage_breaking(std::vector<Rule>& rules, const Device& d, const RuleFacts& facts) {
  Rule symmetrical{DutyQuantity::breaking, {}, {}}, total{DutyQuantity::total_breaking, {}, {}},
      dc{DutyQuantity::dc_component, {}, {}};
  const char* missing = !d.breaking_ka ? "breaking_ka" : !d.opening_time_s ? "opening_time_s" : "";
  symmetrical.missing = total.missing = dc.missing = missing;
  if (*missing != '\0') {
    rules.insert(rules.end(), {symmetrical, total, dc});
    return;
  }
  const double parting_s = switchgear::parting_time_s(*d.opening_time_s, facts.frequency_hz);
  const double tau_s = d.dc_time_constant_ms ? *d.dc_time_constant_ms / 1000 : kStandardTau_s;
  const double rated_dc = rated_dc_percent(*d.opening_time_s, facts.frequency_hz, tau_s);
  const double rating_ka = *d.breaking_ka, total_rating_ka = total_rms_ka(rating_ka, rated_dc);
  const std::string note = d.dc_time_constant_ms ? "" : "time constant 45 ms of the standard";
  symmetrical.evaluate = [=](const Through& t) -> Outcome {
    const auto& at = t.in_time->at(parting_s);
    if (!at.ib_ka) return why_not(at, "Ib");
    const double ka = symmetrical_at(t, *at.ib_ka);
    return Loading{ka, rating_ka, ka, {}, {}, {}, {}};
  };
  // dc and ac at contact parting, the dc in the proportion of the initial current.
  struct Parts {
    double ac_ka, dc_ka;
  };
  const auto parts = [=](const Through& t, std::string& why) -> std::optional<Parts> {
    const auto& at = t.in_time->at(parting_s);
    if (!at.ib_ka || !at.idc_ka) {
      why = why_not(at, at.ib_ka ? "i_dc" : "Ib");
      return std::nullopt;
    }
    return Parts{symmetrical_at(t, *at.ib_ka), t.bus_ka > 0 ? *at.idc_ka * t.ka / t.bus_ka : 0};
  };
  total.evaluate = [=](const Through& t) -> Outcome {
    std::string why;
    const auto p = parts(t, why);
    if (!p) return why;
    return Loading{std::hypot(p->ac_ka, p->dc_ka), total_rating_ka, p->ac_ka, {}, {}, {}, note};
  };
  // That of the fault with the largest total current: a small fault may have a larger percentage of little.
  dc.evaluate = [=](const Through& t) -> Outcome {
    std::string why;
    const auto p = parts(t, why);
    if (!p) return why;
    const double total_ka = std::hypot(p->ac_ka, p->dc_ka);
    const double percent = p->ac_ka > 0 ? 100 * p->dc_ka / (std::sqrt(2.0) * p->ac_ka) : 0;
    Loading loading{percent, rated_dc, p->ac_ka, {}, {}, {}, note, false, total_ka / total_rating_ka, {}};
    if (percent > rated_dc && total_ka <= total_rating_ka)
      loading.undecided = rounded_text(percent, 1) + " % above the rated " + rounded_text(rated_dc, 1) +
                          " % at a total current inside the rating: the last loop decides, ask the maker";
    return loading;
  };
  rules.insert(rules.end(), {symmetrical, total, dc});
}

void add_low_voltage_breaking(std::vector<Rule>& rules, const Device& d) {
  Rule ultimate{DutyQuantity::breaking, {}, {}}, service{DutyQuantity::service_breaking, {}, {}};
  const auto against = [](double rating, double class_power_factor) {
    return [=](const Through& t) -> Outcome {
      Loading loading{t.ka, rating, t.ka, {}, {}, {}, {}};
      if (const auto z = t.fault->result.z1_ohm; z && class_power_factor > 0) {
        const double power_factor = z->real() / std::abs(*z);
        if (power_factor < class_power_factor)
          loading.note = "power factor " + rounded_text(power_factor, 2) + " below the " +
                         rounded_text(class_power_factor, 2) + " of its test: the making current decides";
      }
      return loading;
    };
  };
  if (d.icu_ka)
    ultimate.evaluate = against(*d.icu_ka, low_voltage_class(*d.icu_ka).power_factor);
  else
    ultimate.missing = "icu_ka";
  if (d.ics_ka)
    service.evaluate = against(*d.ics_ka, 0);
  else
    service.missing = "ics_ka";
  rules.insert(rules.end(), {ultimate, service});
  std::optional<double> making = d.icm_ka;
  std::string note;
  if (!making && d.icu_ka) {
    making = low_voltage_class(*d.icu_ka).making_over_breaking * *d.icu_ka;
    note = "Icm from Icu by IEC 60947-2, table 2";
  }
  add_peak(rules, DutyQuantity::making_peak, making, "icm_ka", note);
}

}  // namespace

const iec60909::AtTime& FaultInTime::at(double t_s) {
  for (const auto& [time, value] : known_)
    if (time == t_s) return value;
  return known_.emplace_back(t_s, fault_->study->iec60909()->at_time(fault_->result, t_s)).second;
}

std::optional<double> parting_time_s(const Device& d, double frequency_hz) {
  if (d.standard != DeviceStandard::iec62271_100 || !d.opening_time_s || !d.breaking_ka) return std::nullopt;
  return switchgear::parting_time_s(*d.opening_time_s, frequency_hz);
}

std::vector<Rule> iec_rules(const Device& d, const RuleFacts& facts) {
  std::vector<Rule> rules;
  switch (d.standard) {
    case DeviceStandard::iec62271_100: {
      add_high_voltage_breaking(rules, d, facts);
      std::string missing = "making_peak_ka";
      if (d.breaking_ka) {
        const double tau_s = d.dc_time_constant_ms.value_or(1000 * kStandardTau_s) / 1000;
        missing += " (the standard's ratio would make it " +
                   rounded_text(peak_factor(facts.frequency_hz, tau_s) * *d.breaking_ka, 1) +
                   ": confirm on the plate)";
      }
      add_peak(rules, DutyQuantity::making_peak, d.making_peak_ka, missing);
      add_short_time(rules, d.short_time_ka, "short_time_ka", d.short_time_s, "short_time_s", facts);
      break;
    }
    case DeviceStandard::iec62271_103:
      add_peak(rules, DutyQuantity::making_peak, d.making_peak_ka, "making_peak_ka");
      add_short_time(rules, d.short_time_ka, "short_time_ka", d.short_time_s, "short_time_s", facts);
      break;
    case DeviceStandard::iec60947_2:
      add_low_voltage_breaking(rules, d);
      if (!d.instantaneous_trip.value_or(false))  // one that trips at once is not asked to wait
        add_short_time(rules, d.icw_ka, "icw_ka, or instantaneous_trip true", d.icw_s, "icw_s", facts);
      break;
    case DeviceStandard::iec60947_3:
      add_peak(rules, DutyQuantity::making_peak, d.icm_ka, "icm_ka");
      add_short_time(rules, d.icw_ka, "icw_ka", d.icw_s, "icw_s", facts);
      break;
    case DeviceStandard::iec62271_200:
    case DeviceStandard::iec61439:
      add_short_time(rules, d.short_time_ka, "short_time_ka", d.short_time_s, "short_time_s", facts);
      add_peak(rules, DutyQuantity::peak_withstand, d.peak_withstand_ka, "peak_withstand_ka");
      break;
    default: {  // fuses
      Rule rule{DutyQuantity::breaking, {}, {}};
      if (!d.breaking_ka)
        rule.missing = "breaking_ka";
      else
        rule.evaluate = [rating = *d.breaking_ka](const Through& t) {
          return Loading{t.ka, rating, t.ka, {}, {}, {}, {}};
        };
      rules.push_back(std::move(rule));
    }
  }
  return rules;
}

}  // namespace kiloamp::detail
