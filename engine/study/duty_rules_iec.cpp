#include <cmath>

#include "engine/standard/iec60909/formulas.hpp"
#include "engine/standard/switchgear/iec_ratings.hpp"
#include "engine/study/duty_rules.hpp"
#include "engine/study/rounded_text.hpp"

namespace kiloamp::detail {

namespace {

using namespace switchgear;

constexpr const char* kOwnRatio = "X/R of the part that flows is above that of the whole fault";

// R/X that decides the peak of a part. At a machine's own terminals that of 6.6.1, as the standard has it for
// the peak.
std::optional<double> own_r_over_x(const Through& t, const std::optional<double>& machine) {
  if (t.side == DutySide::own && machine) return machine;
  return t.own_x_over_r ? std::optional(1 / *t.own_x_over_r) : std::nullopt;
}

// Factor of the whole fault, or that of the part where it is larger.
Loading with_factor(const Through& t, double whole, const std::optional<double>& part, double rating) {
  const double factor = std::max(whole, part.value_or(0));
  Loading loading{t.ka * factor, rating, t.ka, std::nullopt, factor, std::nullopt, {}};
  if (factor > whole) loading.note = kOwnRatio;
  return loading;
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
    rule.evaluate = [rating = withstand_ka(*rated_ka, *rated_s, facts.duration_s),
                     facts](const Through& t) -> Outcome {
      const iec60909::Quantities& q = *t.fault->iec60909;
      if (!q.ith_ka || t.bus_ka == 0) return std::string("Ith has no value: see the notes of the study");
      std::optional<double> part;
      if (const auto rx = own_r_over_x(t, facts.machine_r_over_x); rx && q.n)
        part =
            std::sqrt(iec60909::m_factor(iec60909::kappa(*rx), facts.frequency_hz, facts.duration_s) + *q.n);
      return with_factor(t, *q.ith_ka / t.bus_ka, part, rating);
    };
  rules.push_back(std::move(rule));
}

void add_peak(std::vector<Rule>& rules, DutyQuantity quantity, const std::optional<double>& rated_ka,
              const std::string& missing, const RuleFacts& facts, std::string note = {}) {
  Rule rule{quantity, {}, {}};
  if (!rated_ka)
    rule.missing = missing;
  else
    rule.evaluate = [rating = *rated_ka, facts, note = std::move(note)](const Through& t) -> Outcome {
      const iec60909::Quantities& q = *t.fault->iec60909;
      if (!q.ip_ka || t.bus_ka == 0) return std::string("ip has no value: the impedance is not inductive");
      auto rx = own_r_over_x(t, facts.machine_r_over_x);
      const auto part = rx ? std::optional(std::sqrt(2.0) * iec60909::kappa(*rx)) : std::nullopt;
      Loading loading = with_factor(t, *q.ip_ka / t.bus_ka, part, rating);
      if (loading.note.empty()) rx = q.r_over_x;
      if (rx && *rx > 0) loading.x_over_r = 1 / *rx;
      loading.note = joined(loading.note, note);
      return loading;
    };
  rules.push_back(std::move(rule));
}

// ac and dc at contact parting.
struct Parting {
  double ac_ka = 0;        ///< not below what flows
  double least_ac_ka = 0;  ///< not above it: the dc percentage is of this
  double dc_ka = 0;
  bool own_ratio = false;
};

// All the decay of the fault may be in the part, but no source keeps less than the least factor mu q.
double least_ac_ka(const Through& t, const iec60909::AtTime& at) {
  if (t.side == DutySide::total) return *at.ib_ka;
  double least_factor = 1;
  for (const iec60909::MachinePart& m : at.machines)
    least_factor = std::min(least_factor, m.mu * m.q.value_or(1));
  return std::max(t.ka - (t.bus_ka - *at.ib_ka), t.ka * least_factor);
}

std::variant<Parting, std::string> at_parting(const Through& t, double parting_s, double frequency_hz) {
  const auto& at = t.in_time->at(parting_s);
  if (!at.ib_ka || !at.idc_ka) return why_not(at, at.ib_ka ? "i_dc" : "Ib");
  const double whole = t.bus_ka > 0 ? *at.idc_ka / t.bus_ka : 0;
  const double part =
      t.own_x_over_r ? iec60909::dc_current_ka(1, frequency_hz, parting_s, 1 / *t.own_x_over_r) : 0;
  return Parting{symmetrical_at(t, *at.ib_ka), least_ac_ka(t, at), t.ka * std::max(whole, part),
                 part > whole};
}

// Percent against percent of the rated breaking current. More than rated percent of a smaller current has
// been proven when its dc current is not above the rated one and the current still crosses zero; otherwise
// the last loop before interruption decides, which no rms value tells.
Loading dc_loading(const Parting& p, double rating_ka, double rated_percent, double total_rating_ka) {
  constexpr double kFirstOver = 200,
                   kThenUndecided = 100;  // ranks; below them the total current against its rating
  const double crest = std::sqrt(2.0), total_ka = std::hypot(p.ac_ka, p.dc_ka);
  const double percent = p.least_ac_ka > 0 ? 100 * p.dc_ka / (crest * p.least_ac_ka) : 0;
  const double of_rated_percent = 100 * p.dc_ka / (crest * rating_ka);
  Loading loading{percent, rated_percent, p.ac_ka, {}, {}, {}, {}, false, total_ka / total_rating_ka};
  if (percent <= rated_percent) return loading;
  if (total_ka > total_rating_ka) {
    loading.rank = kFirstOver + total_ka / total_rating_ka;
  } else if (percent >= 100 || of_rated_percent > rated_percent) {
    loading.rank = kThenUndecided + of_rated_percent / rated_percent;
    loading.undecided = rounded_text(percent, 1) + " % above the rated " + rounded_text(rated_percent, 1) +
                        " % at a total current inside the rating: " +
                        (percent >= 100 ? "the current does not cross zero at contact parting, ask the maker"
                                        : "the last loop decides, ask the maker");
  } else {
    loading.duty = of_rated_percent;
    loading.note = rounded_text(percent, 1) +
                   " % of its own crest, in percent of the rated current's crest: less dc "
                   "current than was tested";
  }
  return loading;
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
  const double f = facts.frequency_hz, parting_s = switchgear::parting_time_s(*d.opening_time_s, f);
  const double tau_s = d.dc_time_constant_ms ? *d.dc_time_constant_ms / 1000 : kStandardTau_s;
  const double rated_dc = rated_dc_percent(*d.opening_time_s, f, tau_s);
  const double rating_ka = *d.breaking_ka, total_rating_ka = total_rms_ka(rating_ka, rated_dc);
  const std::string note = d.dc_time_constant_ms ? "" : "time constant 45 ms of the standard";
  symmetrical.evaluate = [=](const Through& t) -> Outcome {
    const auto& at = t.in_time->at(parting_s);
    if (!at.ib_ka) return why_not(at, "Ib");
    const double ka = symmetrical_at(t, *at.ib_ka);
    return Loading{ka, rating_ka, ka, {}, {}, {}, {}};
  };
  total.evaluate = [=](const Through& t) -> Outcome {
    const auto parting = at_parting(t, parting_s, f);
    if (const auto* why = std::get_if<std::string>(&parting)) return *why;
    const Parting& p = std::get<Parting>(parting);
    return Loading{std::hypot(p.ac_ka, p.dc_ka),
                   total_rating_ka,
                   p.ac_ka,
                   {},
                   {},
                   {},
                   joined(note, p.own_ratio ? kOwnRatio : "")};
  };
  dc.evaluate = [=](const Through& t) -> Outcome {
    const auto parting = at_parting(t, parting_s, f);
    if (const auto* why = std::get_if<std::string>(&parting)) return *why;
    const Parting& p = std::get<Parting>(parting);
    Loading loading = dc_loading(p, rating_ka, rated_dc, total_rating_ka);
    loading.note = joined(joined(note, loading.note), p.own_ratio ? kOwnRatio : "");
    return loading;
  };
  rules.insert(rules.end(), {symmetrical, total, dc});
}

void add_low_voltage_breaking(std::vector<Rule>& rules, const Device& d, const RuleFacts& facts) {
  Rule ultimate{DutyQuantity::breaking, {}, {}}, service{DutyQuantity::service_breaking, {}, {}};
  const auto against = [](double rating, double class_power_factor) {
    return [=](const Through& t) -> Outcome {
      Loading loading{t.ka, rating, t.ka, {}, {}, {}, {}};
      if (const auto z = t.fault->result.z1_ohm; z && class_power_factor > 0) {
        const double whole = z->real() / std::abs(*z);
        const double power_factor =
            t.own_x_over_r ? std::min(whole, 1 / std::hypot(1.0, *t.own_x_over_r)) : whole;
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
  add_peak(rules, DutyQuantity::making_peak, making, "icm_ka", facts, note);
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
  const auto short_time = [&] {
    add_short_time(rules, d.short_time_ka, "short_time_ka", d.short_time_s, "short_time_s", facts);
  };
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
      add_peak(rules, DutyQuantity::making_peak, d.making_peak_ka, missing, facts);
      short_time();
      break;
    }
    case DeviceStandard::iec62271_103:
      add_peak(rules, DutyQuantity::making_peak, d.making_peak_ka, "making_peak_ka", facts);
      short_time();
      break;
    case DeviceStandard::iec60947_2:
      add_low_voltage_breaking(rules, d, facts);
      if (!d.instantaneous_trip.value_or(false))  // one that trips at once is not asked to wait
        add_short_time(rules, d.icw_ka, "icw_ka, or instantaneous_trip true", d.icw_s, "icw_s", facts);
      break;
    case DeviceStandard::iec60947_3:
      add_peak(rules, DutyQuantity::making_peak, d.icm_ka, "icm_ka", facts);
      add_short_time(rules, d.icw_ka, "icw_ka", d.icw_s, "icw_s", facts);
      break;
    case DeviceStandard::iec62271_200:
    case DeviceStandard::iec61439:
      short_time();
      add_peak(rules, DutyQuantity::peak_withstand, d.peak_withstand_ka, "peak_withstand_ka", facts);
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
  require_rated_voltage(d, rules);
  return rules;
}

}  // namespace kiloamp::detail
