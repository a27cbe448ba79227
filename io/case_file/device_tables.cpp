// The fields of what stands on a bus or at a branch's terminal: breakers, fuses, switchboards, relays.
#include "io/case_file/device_tables.hpp"

#include "io/case_file/table_maker.hpp"

namespace kiloamp::case_file {

namespace {

using Words = std::vector<std::string_view>;
const Words kStandard{"iec62271-100", "iec62271-103",    "iec62271-200",
                      "iec60947-2",   "iec60947-3",      "iec61439",
                      "iec60282-1",   "iec60269",        "c37-total-current",
                      "c37-k-factor", "c37-constant-ka", "c37.13",
                      "c37.20",       "ul489",           "c37.41",
                      "ul248"};
const Words kFunction{"phase_overcurrent", "earth_overcurrent", "negative_sequence_overcurrent",
                      "undervoltage", "residual_overvoltage"};
const Words kCurve{
    "definite_time",         "iec_a", "iec_b", "iec_c", "ieee_moderately_inverse", "ieee_very_inverse",
    "ieee_extremely_inverse"};

const Table& relay_element_table() {
  using R = RelayElement;
  static const Table t = TableMaker<R>(ElementKind::relay, false)
                             .word<&R::function, &kFunction>("function", true)
                             .number<&R::pickup_a>("pickup_a", Range::positive)
                             .number<&R::pickup_v>("pickup_v", Range::positive)
                             .word<&R::curve, &kCurve>("curve", true)
                             .number<&R::time_multiplier>("time_multiplier", Range::positive)
                             .number<&R::time_s>("time_s", Range::non_negative)
                             .choice({{"pickup_a"}, {"pickup_v"}}, "give the pickup in amperes or in volts")
                             .done();
  return t;
}

template <typename D, auto Section>
Table devices(ElementKind kind) {
  return TableMaker<D>(kind)
      .template section<Section>()
      .template reference<&D::bus>("bus", Target::bus)
      .template reference<&D::branch>("branch", Target::branch, false)
      .template word<&D::standard, &kStandard>("standard", true)
      .template number<&D::rated_kv>("rated_kv", Range::positive)
      .template number<&D::rated_a>("rated_a", Range::positive)
      .template number<&D::breaking_ka>("breaking_ka", Range::positive)
      .template number<&D::making_peak_ka>("making_peak_ka", Range::positive)
      .template number<&D::short_time_ka>("short_time_ka", Range::positive)
      .template number<&D::short_time_s>("short_time_s", Range::positive)
      .template number<&D::dc_time_constant_ms>("dc_time_constant_ms", Range::positive)
      .template number<&D::opening_time_s>("opening_time_s", Range::positive)
      .template number<&D::icu_ka>("icu_ka", Range::positive)
      .template number<&D::ics_ka>("ics_ka", Range::positive)
      .template number<&D::icm_ka>("icm_ka", Range::positive)
      .template number<&D::icw_ka>("icw_ka", Range::positive)
      .template number<&D::icw_s>("icw_s", Range::positive)
      .template number<&D::k_factor>("k_factor", Range::positive)
      .template number<&D::interrupting_mva>("interrupting_mva", Range::positive)
      .template number<&D::interrupting_ka>("interrupting_ka", Range::positive)
      .template number<&D::close_latch_rms_ka>("close_latch_rms_ka", Range::positive)
      .template number<&D::close_latch_peak_ka>("close_latch_peak_ka", Range::positive)
      .template number<&D::interrupting_time_cycles>("interrupting_time_cycles", Range::positive)
      .template number<&D::contact_parting_cycles>("contact_parting_cycles", Range::positive)
      .template number<&D::test_power_factor>("test_power_factor", Range::fraction)
      .template boolean<&D::instantaneous_trip>("instantaneous_trip")
      .template boolean<&D::fused>("fused")
      .template numbers<&D::local_curve_x_over_r>("local_curve_x_over_r", Range::positive, AnyCount{})
      .template numbers<&D::local_curve_factor>("local_curve_factor", Range::positive, AnyCount{})
      .done();
}

}  // namespace

Table breakers_table() { return devices<Breaker, &Network::breakers>(ElementKind::breaker); }
Table fuses_table() { return devices<Fuse, &Network::fuses>(ElementKind::fuse); }

Table switchboards_table() {
  using S = Switchboard;
  return TableMaker<S>(ElementKind::switchboard)
      .section<&Network::switchboards>()
      .reference<&S::bus>("bus", Target::bus)
      .word<&S::standard, &kStandard>("standard", true)
      .number<&S::rated_kv>("rated_kv", Range::positive)
      .number<&S::rated_a>("rated_a", Range::positive)
      .number<&S::short_time_ka>("short_time_ka", Range::positive)
      .number<&S::short_time_s>("short_time_s", Range::positive)
      .number<&S::peak_withstand_ka>("peak_withstand_ka", Range::positive)
      .done();
}

Table relays_table() {
  using R = Relay;
  return TableMaker<R>(ElementKind::relay)
      .section<&Network::relays>()
      .reference<&R::bus>("bus", Target::bus)
      .reference<&R::branch>("branch", Target::branch, false)
      .numbers<&R::ct_ratio>("ct_ratio", Range::positive)
      .numbers<&R::vt_ratio>("vt_ratio", Range::positive)
      .objects<&R::elements>("elements", relay_element_table())
      .done();
}

}  // namespace kiloamp::case_file
