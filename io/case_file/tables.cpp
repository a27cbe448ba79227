// The fields of every element of a case.
#include <array>

#include "io/case_file/device_tables.hpp"
#include "io/case_file/table_maker.hpp"

namespace kiloamp::case_file {

namespace {

using Words = std::vector<std::string_view>;
const Words kGrounding{"solid", "impedance", "open"};
const Words kMvaBasis{"three_phase", "single_phase"};
const Words kRole{"generator", "motor", "condenser"};
const Words kRotor{"cylindrical", "salient_pole"};
const Words kExcitation{"rotating", "static_compound", "static_terminal_fed"};
const Words kNegative{"none", "impedance"};
const Words kLine{"overhead", "cable"};
const Words kCore{"three_limb", "five_limb", "shell", "single_phase_bank"};
const Words kSide{"hv", "mv", "lv"};
const Words kFeeders{"max", "min"};

constexpr std::string_view kSign = "check the sign; a series reactance is positive";
constexpr std::string_view kPlate = "copy the value from the nameplate or data sheet";
constexpr std::string_view kOneResistance = "give one of them and leave the others out";

const Table& neutral_table() {
  using N = Neutral;
  static const Table t =
      TableMaker<N>(ElementKind::bus, false)
          .word<&N::grounding, &kGrounding>("grounding", true)
          .number<&N::r_ohm>("r_ohm", Range::non_negative, false,
                             "give the resistance between neutral and earth, not its triple")
          .number<&N::x_ohm>("x_ohm", Range::any)
          .done();
  return t;
}

const Table& level_table() {
  using L = FeederLevel;
  static const Table t =
      TableMaker<L>(ElementKind::bus, false)
          .number<&L::three_phase_ka>("three_phase_ka", Range::positive)
          .number<&L::three_phase_mva>("three_phase_mva", Range::positive)
          .number<&L::x_over_r>("x_over_r", Range::positive)
          .number<&L::line_to_ground_ka>("line_to_ground_ka", Range::positive)
          .number<&L::line_to_ground_mva>("line_to_ground_mva", Range::positive)
          .word<&L::line_to_ground_mva_basis, &kMvaBasis>("line_to_ground_mva_basis")
          .number<&L::x0_over_r0>("x0_over_r0", Range::positive)
          .number<&L::x0_over_x1>("x0_over_x1", Range::positive)
          .number<&L::r0_over_x0>("r0_over_x0", Range::non_negative)
          .number<&L::z2_over_z1>("z2_over_z1", Range::positive)
          .number<&L::voltage_factor>("voltage_factor", Range::positive)
          .number<&L::r1_ohm>("r1_ohm", Range::non_negative)
          .number<&L::x1_ohm>("x1_ohm", Range::positive, false, kSign)
          .number<&L::r2_ohm>("r2_ohm", Range::non_negative)
          .number<&L::x2_ohm>("x2_ohm", Range::positive, false, kSign)
          .number<&L::r0_ohm>("r0_ohm", Range::non_negative)
          .number<&L::x0_ohm>("x0_ohm", Range::positive, false, kSign)
          .choice({{"three_phase_ka", "x_over_r"}, {"three_phase_mva", "x_over_r"}, {"r1_ohm", "x1_ohm"}},
                  "give the three-phase level with x_over_r, or r1_ohm and x1_ohm")
          .choice({{"line_to_ground_ka"},
                   {"line_to_ground_mva"},
                   {"x0_over_x1", "r0_over_x0"},
                   {"r0_ohm", "x0_ohm"}},
                  "give the earth-fault level in one way, or not at all", false)
          .choice({{"r2_ohm", "x2_ohm"}, {"z2_over_z1"}},
                  "give the negative sequence in one way, or not at all", false)
          .done();
  return t;
}

const Table& tap_table() {
  static const Table t = TableMaker<Tap>(ElementKind::bus, false)
                             .word<&Tap::side, &kSide>("side", true)
                             .number<&Tap::position_percent>("position_percent", Range::any, true)
                             .done();
  return t;
}

const Table& worst_load_table() {
  using W = WorstLoad;
  static const Table t = TableMaker<W>(ElementKind::transformer, false)
                             .number<&W::voltage_kv>("voltage_kv", Range::positive, true)
                             .number<&W::current_a>("current_a", Range::non_negative, true)
                             .number<&W::power_factor>("power_factor", Range::fraction, true)
                             .done();
  return t;
}

const Table& pair_table() {
  using P = WindingPair;
  static const Table t = TableMaker<P>(ElementKind::bus, false)
                             .number<&P::rated_mva>("rated_mva", Range::positive, true, kPlate)
                             .number<&P::z_percent>("z_percent", Range::percent, true, kPlate)
                             .number<&P::r_percent>("r_percent", Range::non_negative)
                             .number<&P::x_over_r>("x_over_r", Range::positive)
                             .number<&P::load_loss_kw>("load_loss_kw", Range::non_negative)
                             .number<&P::z0_percent>("z0_percent", Range::positive)
                             .number<&P::r0_percent>("r0_percent", Range::non_negative)
                             .choice({{"r_percent"}, {"x_over_r"}, {"load_loss_kw"}}, kOneResistance)
                             .done();
  return t;
}

// `auto` is a word of the language; its member is spelled out.
Field vector_group_field(void (*set)(void*, const Value&, std::size_t),
                         bool (*write)(const void*, const Network&, std::string&)) {
  Field f;
  f.name = "vector_group";
  f.type = FieldType::text;
  f.required = true;
  f.remedy = "write it as on the nameplate, for example Dyn11 or YNyn0d5";
  f.set = set;
  f.write = write;
  return f;
}

template <typename E>
Field vector_group_of() {
  return vector_group_field(
      [](void* e, const Value& v, std::size_t) {
        if (auto group = parse_vector_group(v.text))
          static_cast<E*>(e)->vector_group = std::move(*group);
        else
          static_cast<E*>(e)->vector_group.text = v.text;  // judged with the whole element
      },
      [](const void* e, const Network&, std::string& out) {
        append_quoted(out, static_cast<const E*>(e)->vector_group.text);
        return true;
      });
}

Table buses() {
  return TableMaker<Bus>(ElementKind::bus)
      .section<&Network::buses>()
      .number<&Bus::nominal_kv>("nominal_kv", Range::positive, true)
      .number<&Bus::prefault_pu>("prefault_pu", Range::positive)
      .number<&Bus::prefault_deg>("prefault_deg", Range::any)
      .number<&Bus::voltage_tolerance_percent>("voltage_tolerance_percent", Range::positive)
      .numbers<&Bus::position>("position", Range::any)
      .text<&Bus::zone>("zone")
      .done();
}

Table feeders() {
  using F = NetworkFeeder;
  return TableMaker<F>(ElementKind::network_feeder)
      .section<&Network::network_feeders>()
      .reference<&F::bus>("bus", Target::bus)
      .object<&F::max>("max", level_table(), true)
      .object<&F::min>("min", level_table())
      .done();
}

Table machines() {
  using M = SynchronousMachine;
  return TableMaker<M>(ElementKind::synchronous_machine)
      .section<&Network::synchronous_machines>()
      .reference<&M::bus>("bus", Target::bus)
      .word<&M::role, &kRole>("role", true)
      .number<&M::rated_mva>("rated_mva", Range::positive, true, kPlate)
      .number<&M::rated_kv>("rated_kv", Range::positive, true, kPlate)
      .number<&M::power_factor>("power_factor", Range::fraction)
      .number<&M::xd_subtransient_percent>("xd_subtransient_percent", Range::positive, true, kPlate)
      .number<&M::xd_transient_percent>("xd_transient_percent", Range::positive)
      .number<&M::xd_percent>("xd_percent", Range::positive)
      .number<&M::x2_percent>("x2_percent", Range::positive)
      .number<&M::x0_percent>("x0_percent", Range::non_negative)
      .number<&M::ra_percent>("ra_percent", Range::non_negative)
      .number<&M::x_over_r>("x_over_r", Range::positive)
      .object<&M::neutral>("neutral", neutral_table())
      .number<&M::td_subtransient_s>("td_subtransient_s", Range::positive)
      .number<&M::td_transient_s>("td_transient_s", Range::positive)
      .number<&M::ta_s>("ta_s", Range::positive)
      .word<&M::rotor, &kRotor>("rotor")
      .boolean<&M::damper_winding>("damper_winding")
      .word<&M::excitation, &kExcitation>("excitation")
      .number<&M::voltage_range_percent>("voltage_range_percent", Range::non_negative)
      .number<&M::lambda_max>("lambda_max", Range::positive)
      .number<&M::lambda_min>("lambda_min", Range::positive)
      .choice({{"ra_percent"}, {"x_over_r"}}, kOneResistance)
      .done();
}

Table motors() {
  using M = InductionMotor;
  return TableMaker<M>(ElementKind::induction_motor)
      .section<&Network::induction_motors>()
      .reference<&M::bus>("bus", Target::bus)
      .number<&M::count>("count", Range::integer_from_one)
      .number<&M::rated_kw>("rated_kw", Range::positive)
      .number<&M::rated_mw>("rated_mw", Range::positive)
      .number<&M::rated_hp>("rated_hp", Range::positive)
      .number<&M::rated_mva>("rated_mva", Range::positive)
      .number<&M::power_factor>("power_factor", Range::fraction)
      .number<&M::efficiency_percent>("efficiency_percent", Range::percent)
      .number<&M::rated_kv>("rated_kv", Range::positive, true, kPlate)
      .number<&M::locked_rotor_ratio>("locked_rotor_ratio", Range::positive)
      .number<&M::r_over_x>("r_over_x", Range::non_negative)
      .number<&M::pole_pairs>("pole_pairs", Range::integer_from_one)
      .number<&M::speed_rpm>("speed_rpm", Range::positive)
      .boolean<&M::converter_fed>("converter_fed")
      .boolean<&M::feeds_back>("feeds_back")
      .choice({{"rated_kw"}, {"rated_mw"}, {"rated_hp"}, {"rated_mva"}},
              "give the size of one motor in one way")
      .choice({{"pole_pairs"}, {"speed_rpm"}}, "give one of them or neither", false)
      .done();
}

const Table& doubly_fed_table() {
  using D = DoublyFed;
  static const Table t = TableMaker<D>(ElementKind::inverter_source, false)
                             .number<&D::peak_ka>("peak_ka", Range::positive, true, kPlate)
                             .number<&D::kappa>("kappa", Range::positive)
                             .number<&D::r_over_x>("r_over_x", Range::positive, true, kPlate)
                             .done();
  return t;
}

Table inverters() {
  using I = InverterSource;
  return TableMaker<I>(ElementKind::inverter_source)
      .section<&Network::inverter_sources>()
      .reference<&I::bus>("bus", Target::bus)
      .number<&I::rated_mva>("rated_mva", Range::positive, true, kPlate)
      .number<&I::rated_kv>("rated_kv", Range::positive, true, kPlate)
      .number<&I::fault_current_ratio>("fault_current_ratio", Range::non_negative)
      .number<&I::current_angle_deg>("current_angle_deg", Range::any)
      .word<&I::negative_sequence, &kNegative>("negative_sequence")
      .number<&I::z2_percent>("z2_percent", Range::positive)
      .number<&I::x2_over_r2>("x2_over_r2", Range::positive)
      .object<&I::doubly_fed>("doubly_fed", doubly_fed_table())
      .done();
}

Table lines() {
  using L = Line;
  return TableMaker<L>(ElementKind::line)
      .section<&Network::lines>()
      .reference<&L::from>("from", Target::bus)
      .reference<&L::to>("to", Target::bus)
      .word<&L::kind, &kLine>("kind")
      .number<&L::length_km>("length_km", Range::positive, true)
      .number<&L::r1_ohm_per_km>("r1_ohm_per_km", Range::non_negative, true)
      .number<&L::x1_ohm_per_km>("x1_ohm_per_km", Range::positive, true, kSign)
      .number<&L::b1_us_per_km>("b1_us_per_km", Range::non_negative)
      .number<&L::r0_ohm_per_km>("r0_ohm_per_km", Range::non_negative)
      .number<&L::x0_ohm_per_km>("x0_ohm_per_km", Range::positive, false, kSign)
      .number<&L::b0_us_per_km>("b0_us_per_km", Range::non_negative)
      .number<&L::parallel>("parallel", Range::integer_from_one)
      .number<&L::end_temperature_c>("end_temperature_c", Range::any)
      .boolean<&L::earthed_when_out>("earthed_when_out")
      .choice({{"r0_ohm_per_km", "x0_ohm_per_km"}}, "give both or leave both out", false)
      .done();
}

Table couplings() {
  using C = MutualCoupling;
  return TableMaker<C>(ElementKind::mutual_coupling)
      .section<&Network::mutual_couplings>()
      .reference<&C::line_a>("line_a", Target::line)
      .reference<&C::line_b>("line_b", Target::line)
      .number<&C::length_km>("length_km", Range::positive, true)
      .number<&C::r0m_ohm_per_km>("r0m_ohm_per_km", Range::any, true)
      .number<&C::x0m_ohm_per_km>("x0m_ohm_per_km", Range::positive, true,
                                  "turn the coupling round by orientation, not by its sign")
      .number<&C::orientation>("orientation", Range::plus_minus_one)
      .numbers<&C::from_km>("from_km", Range::non_negative, true)
      .done();
}

Table transformers() {
  using T = Transformer;
  return TableMaker<T>(ElementKind::transformer)
      .section<&Network::transformers>()
      .reference<&T::hv_bus>("hv_bus", Target::bus)
      .reference<&T::lv_bus>("lv_bus", Target::bus)
      .number<&T::rated_mva>("rated_mva", Range::positive, true, kPlate)
      .number<&T::hv_kv>("hv_kv", Range::positive, true, kPlate)
      .number<&T::lv_kv>("lv_kv", Range::positive, true, kPlate)
      .number<&T::z_percent>("z_percent", Range::percent, true, kPlate)
      .number<&T::r_percent>("r_percent", Range::non_negative)
      .number<&T::x_over_r>("x_over_r", Range::positive)
      .number<&T::load_loss_kw>("load_loss_kw", Range::non_negative)
      .custom(vector_group_of<T>())
      .number<&T::z0_percent>("z0_percent", Range::positive)
      .number<&T::r0_percent>("r0_percent", Range::non_negative)
      .number<&T::zm0_percent>("zm0_percent", Range::positive)
      .object<&T::hv_neutral>("hv_neutral", neutral_table())
      .object<&T::lv_neutral>("lv_neutral", neutral_table())
      .object<&T::tap>("tap", tap_table())
      .boolean<&T::on_load_tap_changer>("on_load_tap_changer")
      .number<&T::tap_range_percent>("tap_range_percent", Range::non_negative)
      .object<&T::worst_load>("worst_load", worst_load_table())
      .word<&T::core, &kCore>("core")
      .choice({{"r_percent"}, {"x_over_r"}, {"load_loss_kw"}}, kOneResistance)
      .done();
}

Table three_windings() {
  using T = ThreeWindingTransformer;
  return TableMaker<T>(ElementKind::three_winding_transformer)
      .section<&Network::three_winding_transformers>()
      .reference<&T::hv_bus>("hv_bus", Target::bus)
      .reference<&T::mv_bus>("mv_bus", Target::bus)
      .reference<&T::lv_bus>("lv_bus", Target::bus, false)
      .number<&T::hv_kv>("hv_kv", Range::positive, true, kPlate)
      .number<&T::mv_kv>("mv_kv", Range::positive, true, kPlate)
      .number<&T::lv_kv>("lv_kv", Range::positive, true, kPlate)
      .object<&T::hv_mv>("hv_mv", pair_table(), true)
      .object<&T::hv_lv>("hv_lv", pair_table(), true)
      .object<&T::mv_lv>("mv_lv", pair_table(), true)
      .custom(vector_group_of<T>())
      .object<&T::hv_neutral>("hv_neutral", neutral_table())
      .object<&T::mv_neutral>("mv_neutral", neutral_table())
      .object<&T::lv_neutral>("lv_neutral", neutral_table())
      .object<&T::tap>("tap", tap_table())
      .boolean<&T::autotransformer>("auto")
      .number<&T::zm0_percent>("zm0_percent", Range::positive)
      .word<&T::core, &kCore>("core")
      .done();
}

Table earthing_transformers() {
  using E = EarthingTransformer;
  return TableMaker<E>(ElementKind::earthing_transformer)
      .section<&Network::earthing_transformers>()
      .reference<&E::bus>("bus", Target::bus)
      .number<&E::r0_ohm>("r0_ohm", Range::non_negative, true)
      .number<&E::x0_ohm>("x0_ohm", Range::positive, true, kSign)
      .object<&E::neutral>("neutral", neutral_table())
      .done();
}

Table reactors() {
  using R = SeriesReactor;
  return TableMaker<R>(ElementKind::series_reactor)
      .section<&Network::series_reactors>()
      .reference<&R::from>("from", Target::bus)
      .reference<&R::to>("to", Target::bus)
      .number<&R::x_ohm>("x_ohm", Range::not_zero, false, "use a switch for a connection without impedance")
      .number<&R::r_ohm>("r_ohm", Range::non_negative)
      .number<&R::x_percent>("x_percent", Range::positive)
      .number<&R::rated_kv>("rated_kv", Range::positive)
      .number<&R::rated_a>("rated_a", Range::positive)
      .choice({{"x_ohm"}, {"x_percent", "rated_kv", "rated_a"}},
              "give x_ohm, or x_percent with rated_kv and rated_a")
      .done();
}

Table shunts() {
  return TableMaker<Shunt>(ElementKind::shunt)
      .section<&Network::shunts>()
      .reference<&Shunt::bus>("bus", Target::bus)
      .number<&Shunt::mvar>("mvar", Range::not_zero, true, "positive for a capacitor, negative for a reactor")
      .number<&Shunt::rated_kv>("rated_kv", Range::positive, true, kPlate)
      .boolean<&Shunt::grounded>("grounded")
      .done();
}

Table switches() {
  return TableMaker<BusSwitch>(ElementKind::bus_switch)
      .section<&Network::switches>()
      .reference<&BusSwitch::from>("from", Target::bus)
      .reference<&BusSwitch::to>("to", Target::bus)
      .boolean<&BusSwitch::closed>("closed", true)
      .done();
}

Table units() {
  using U = PowerStationUnit;
  return TableMaker<U>(ElementKind::power_station_unit)
      .section<&Network::power_station_units>()
      .reference<&U::machine>("machine", Target::synchronous_machine)
      .reference<&U::transformer>("transformer", Target::transformer)
      .done();
}

Table scenarios() {
  using S = Scenario;
  return TableMaker<S>(ElementKind::scenario)
      .section<&Network::scenarios>()
      .references<&S::open>("open", Target::bus_switch)
      .references<&S::close>("close", Target::bus_switch)
      .references<&S::out>("out", Target::any)
      .references<&S::in>("in", Target::any)
      .word<&S::feeders, &kFeeders>("feeders")
      .done();
}

}  // namespace

const Table& table(ElementKind kind) {
  static const std::array<Table, kSections> tables{buses(),
                                                   feeders(),
                                                   machines(),
                                                   motors(),
                                                   inverters(),
                                                   lines(),
                                                   couplings(),
                                                   transformers(),
                                                   three_windings(),
                                                   earthing_transformers(),
                                                   reactors(),
                                                   shunts(),
                                                   switches(),
                                                   units(),
                                                   breakers_table(),
                                                   fuses_table(),
                                                   switchboards_table(),
                                                   relays_table(),
                                                   scenarios()};
  return tables[static_cast<std::size_t>(kind)];
}

}  // namespace kiloamp::case_file
