#include <algorithm>
#include <cmath>

#include "engine/standard/ieee_c37/formulas.hpp"
#include "engine/study/duty_rules.hpp"
#include "engine/study/rounded_text.hpp"

namespace kiloamp::detail {

namespace {

using namespace ieee_c37;

constexpr const char* kNoRatio = "X/R of the separate networks is not positive";
constexpr double kStandardTau_s = 0.045;
constexpr double kMediumVoltageFuseTestXOverR = 15;  // common practice, no source

constexpr const char* kOwnRatio = "X/R of the part that flows, above that of the whole fault";

// X/R of the whole fault by the separate networks, or of the part that flows where it is larger.
struct Ratio {
  double x_over_r;
  std::string note;
};
std::optional<Ratio> ratio_of(const std::optional<double>& whole, const std::optional<double>& part) {
  if (!whole) return std::nullopt;
  if (part && *part > *whole) return Ratio{*part, kOwnRatio};
  return Ratio{*whole, {}};
}
bool is_line_to_ground(const Through& t) { return t.kind == FaultKind::line_to_ground; }

// Symmetrical interrupting capability at the operating voltage, and the largest current it may have at any.
struct Capability {
  std::string missing;
  std::function<double(const Through&)> at;
  double most_ka = 0;
};
Capability capability_of(const Device& d) {
  if (!d.interrupting_ka) return {"interrupting_ka", {}, 0};
  const double ka = *d.interrupting_ka;
  if (d.standard == DeviceStandard::c37_total_current) {
    if (!d.interrupting_mva) return {"interrupting_mva", {}, 0};
    return {{},
            [ka, mva = *d.interrupting_mva](const Through& t) {
              return total_current_capability_ka(mva, ka, t.operating_kv);
            },
            ka};
  }
  if (d.standard == DeviceStandard::c37_k_factor) {
    if (!d.rated_kv) return {"rated_kv", {}, 0};
    if (!d.k_factor) return {"k_factor", {}, 0};
    return {{},
            [ka, kv = *d.rated_kv, k = *d.k_factor](const Through& t) {
              return k_factor_capability_ka(ka, kv, k, t.operating_kv, is_line_to_ground(t));
            },
            ka * *d.k_factor};
  }
  if (!d.rated_kv) return {"rated_kv", {}, 0};  // constant up to it
  return {{}, [ka](const Through&) { return ka; }, ka};
}

std::optional<double> parting_of(const Device& d) {
  if (d.contact_parting_cycles) return d.contact_parting_cycles;
  return d.interrupting_time_cycles ? parting_cycles(*d.interrupting_time_cycles) : std::nullopt;
}

double remote_of(const Device& d, double x_over_r, double parting, double frequency_hz) {
  if (d.standard == DeviceStandard::c37_total_current) return remote_factor_total(x_over_r, parting);
  if (d.standard == DeviceStandard::c37_k_factor) return remote_factor(x_over_r, parting);
  const double tau_s = d.dc_time_constant_ms ? *d.dc_time_constant_ms / 1000 : kStandardTau_s;
  return constant_ka_factor(x_over_r, parting / frequency_hz, frequency_hz, tau_s);
}

// What the standard assumes of a breaker that states its interrupting time only.
std::string timing_words(const Device& d, double parting) {
  std::string text = "contact parting " + rounded_text(parting, 1) + " cycles by the rated interrupting time";
  if (d.standard == DeviceStandard::c37_k_factor)
    text += ", S " + rounded_text(asymmetry_of_rating(parting), 1);
  return text;
}

void add_interrupting(std::vector<Rule>& rules, const Device& d, const RuleFacts& facts) {
  Rule rule{DutyQuantity::breaking, {}, {}};
  const Capability capability = capability_of(d);
  const auto parting = parting_of(d);
  if (!capability.missing.empty())
    rule.missing = capability.missing;
  else if (!parting)
    rule.missing =
        d.interrupting_time_cycles
            ? "contact_parting_cycles (no contact parting time is known for this interrupting time)"
            : "interrupting_time_cycles or contact_parting_cycles";
  else
    rule.evaluate = [capability, d = &d, parting = *parting, f = facts.frequency_hz,
                     timing = d.contact_parting_cycles ? std::string() : timing_words(d, *parting)](
                        const Through& t) -> Outcome {
      const auto ratio = ratio_of(t.fault->c37->interrupting.x_over_r, t.own_interrupting_x_over_r);
      if (!ratio) return std::string(kNoRatio);
      const double nacd = t.fault->c37->nacd, remote = remote_of(*d, ratio->x_over_r, parting, f);
      double factor = remote;
      std::string note = timing;
      if (nacd < 1 && d->local_curve_factor) {
        factor = mixed_factor(curve_value(*d->local_curve_x_over_r, *d->local_curve_factor, ratio->x_over_r),
                              remote, nacd);
        note = joined(note, "local and remote by NACD, the owner's curve");
      } else if (nacd < 1) {
        note =
            joined(note, "remote factor for want of a curve with local decay, which errs to the safe side");
      }
      Loading loading{
          t.interrupting_ka * factor, capability.at(t), t.interrupting_ka, ratio->x_over_r, factor, nacd,
          joined(note, ratio->note)};
      loading.interrupting = true;
      return loading;
    };
  rules.push_back(std::move(rule));
}

// Total rms and crest of the first cycle against the plate, or the ratio of the generation.
void add_close_latch(std::vector<Rule>& rules, const Device& d, const RuleFacts& facts) {
  const Capability capability = capability_of(d);
  const bool constant = d.standard == DeviceStandard::c37_constant_ka;
  const auto rule_for = [&](DutyQuantity quantity, const std::optional<double>& plate, double times,
                            double (*factor_of)(double)) {
    Rule rule{quantity, {}, {}};
    if (!plate && !capability.missing.empty()) {
      rule.missing = capability.missing;
      return rule;
    }
    const double rating = plate ? *plate : times * capability.most_ka;
    const std::string note =
        plate ? "" : "rating " + rounded_text(times, 1) + " times the largest interrupting current";
    rule.evaluate = [=](const Through& t) -> Outcome {
      const auto ratio = ratio_of(t.fault->c37->first_cycle.x_over_r, t.own_x_over_r);
      if (!ratio) return std::string(kNoRatio);
      const double factor = factor_of(ratio->x_over_r);
      return Loading{t.ka * factor, rating, t.ka, ratio->x_over_r, factor, {}, joined(note, ratio->note)};
    };
    return rule;
  };
  if (!constant)
    rules.push_back(
        rule_for(DutyQuantity::close_latch_rms, d.close_latch_rms_ka, kMomentaryRms, half_cycle_asymmetry));
  if (d.standard != DeviceStandard::c37_total_current)
    rules.push_back(rule_for(DutyQuantity::making_peak, d.close_latch_peak_ka,
                             !constant                 ? kMomentaryCrest
                             : facts.frequency_hz < 55 ? 2.5
                                                       : 2.6,
                             crest_factor));
}

void add_short_time(std::vector<Rule>& rules, const std::optional<double>& rated_ka,
                    const std::string& missing, bool first_cycle, std::string note) {
  Rule rule{DutyQuantity::short_time, {}, {}};
  if (!rated_ka)
    rule.missing = missing;
  else
    rule.evaluate = [rating = *rated_ka, first_cycle, note = std::move(note)](const Through& t) {
      const double ka = first_cycle ? t.ka : t.interrupting_ka;
      Loading loading{ka, rating, ka, {}, {}, {}, note};
      loading.interrupting = !first_cycle;
      return loading;
    };
  rules.push_back(std::move(rule));
}

// First-cycle symmetrical current times the factor by which its X/R is above that of the test.
void add_tested(std::vector<Rule>& rules, const Device& d, double test, double (*factor_of)(double, double),
                std::string note) {
  Rule rule{DutyQuantity::breaking, {}, {}};
  if (!d.interrupting_ka)
    rule.missing = "interrupting_ka";
  else
    rule.evaluate = [=, rating = *d.interrupting_ka, note = std::move(note)](const Through& t) -> Outcome {
      const auto ratio = ratio_of(t.fault->c37->first_cycle.x_over_r, t.own_x_over_r);
      if (!ratio) return std::string(kNoRatio);
      const double factor = factor_of(ratio->x_over_r, test);
      return Loading{t.ka * factor, rating, t.ka, ratio->x_over_r, factor, {}, joined(note, ratio->note)};
    };
  rules.push_back(std::move(rule));
}

void add_low_voltage(std::vector<Rule>& rules, const Device& d, double standard_power_factor, bool fused) {
  const double power_factor = d.test_power_factor.value_or(standard_power_factor);
  add_tested(
      rules, d, test_x_over_r(power_factor), fused ? rms_based_factor : peak_based_factor,
      "test power factor " + rounded_text(power_factor, 2) + (d.test_power_factor ? "" : " of the standard"));
}

}  // namespace

std::vector<Rule> c37_rules(const Device& d, const RuleFacts& facts) {
  std::vector<Rule> rules;
  switch (d.standard) {
    case DeviceStandard::c37_13:
      add_low_voltage(rules, d, d.fused.value_or(false) ? 0.20 : 0.15, d.fused.value_or(false));
      if (!d.instantaneous_trip)
        rules.push_back(
            {DutyQuantity::short_time, "instantaneous_trip (true, or false with short_time_ka)", {}});
      else if (!*d.instantaneous_trip)
        add_short_time(rules, d.short_time_ka, "short_time_ka", false,
                       "interrupting network: no further decay until the delayed trip is credited");
      break;
    case DeviceStandard::ul489:
      add_low_voltage(rules, d, ul489_test_power_factor(d.interrupting_ka.value_or(0)), false);
      break;
    case DeviceStandard::ul248:
      add_low_voltage(rules, d, 0.20, true);
      break;
    case DeviceStandard::c37_41:
      add_tested(rules, d,
                 d.test_power_factor ? test_x_over_r(*d.test_power_factor) : kMediumVoltageFuseTestXOverR,
                 rms_based_factor, d.test_power_factor ? "" : "tested at X/R 15 (common practice)");
      break;
    case DeviceStandard::c37_20: {
      add_short_time(rules, d.short_time_ka, "short_time_ka", true, {});
      Rule rule{DutyQuantity::peak_withstand, {}, {}};
      if (!d.peak_withstand_ka)
        rule.missing = "peak_withstand_ka";
      else
        rule.evaluate = [rating = *d.peak_withstand_ka](const Through& t) -> Outcome {
          const auto ratio = ratio_of(t.fault->c37->first_cycle.x_over_r, t.own_x_over_r);
          if (!ratio) return std::string(kNoRatio);
          const double factor = crest_factor(ratio->x_over_r);
          return Loading{t.ka * factor, rating, t.ka, ratio->x_over_r, factor, {}, ratio->note};
        };
      rules.push_back(std::move(rule));
      break;
    }
    default:
      add_interrupting(rules, d, facts);
      add_close_latch(rules, d, facts);
      if (d.short_time_ka) add_short_time(rules, d.short_time_ka, "short_time_ka", true, {});
  }
  require_rated_voltage(d, rules);
  return rules;
}

std::string simplified_finding(const Device& d, const Through& t) {
  const Capability capability = capability_of(d);
  const auto& network = t.fault->c37->interrupting;
  // The check belongs to ratings on symmetrical current.
  const bool symmetrical =
      d.standard == DeviceStandard::c37_k_factor || d.standard == DeviceStandard::c37_constant_ka;
  if (!symmetrical || !capability.missing.empty() || !network.x_over_r || network.ez_ka == 0) return {};
  const double ex_ka = network.ex_ka * t.interrupting_ka / network.ez_ka, most_ka = capability.at(t);
  return std::string("simplified check, ") +
         (is_line_to_ground(t) ? "line to ground" : "three-phase or two-phase") + ": E/X " +
         rounded_text(ex_ka, 2) + " kA, X/R " + rounded_text(*network.x_over_r, 1) + " against " +
         rounded_text(most_ka, 2) + " kA " +
         (simplified_check(ex_ka, most_ka, *network.x_over_r, is_line_to_ground(t))
              ? "suffices"
              : "does not suffice: the factors decide");
}

}  // namespace kiloamp::detail
