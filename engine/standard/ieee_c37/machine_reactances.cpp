#include "engine/standard/ieee_c37/machine_reactances.hpp"

#include "engine/network/state.hpp"

namespace kiloamp::ieee_c37 {

namespace {

constexpr double kKwPerHp = 0.745699872;
constexpr double kLargeHp = 1000, kTwoPoleLargeHp = 250;

bool needs_transient(MachineClass machine, DutyNetwork network) {
  return machine == MachineClass::hydro_without_dampers ||
         (machine == MachineClass::generator && network == DutyNetwork::delayed);
}

}  // namespace

const char* class_words(MachineClass machine) {
  switch (machine) {
    case MachineClass::generator:
      return "generator or condenser";
    case MachineClass::hydro_without_dampers:
      return "hydro generator without dampers";
    case MachineClass::synchronous_motor:
      return "synchronous motor";
    case MachineClass::large_induction:
      return "induction motor above 1000 hp, or 250 hp at one pole pair";
    case MachineClass::medium_induction:
      return "induction motor from 50 hp";
    case MachineClass::small_induction:
      return "induction motor below 50 hp";
  }
  return "";
}

std::optional<double> reactance_factor(MachineClass machine, DutyNetwork network, SmallMotors small,
                                       double transient_over_subtransient) {
  const bool first = network == DutyNetwork::first_cycle, delayed = network == DutyNetwork::delayed;
  switch (machine) {
    case MachineClass::generator:
      return delayed ? transient_over_subtransient : 1.0;
    case MachineClass::hydro_without_dampers:
      return (delayed ? 1.0 : 0.75) * transient_over_subtransient;
    case MachineClass::synchronous_motor:
    case MachineClass::large_induction:
      if (delayed) return std::nullopt;
      return first ? 1.0 : 1.5;
    case MachineClass::medium_induction:
      if (delayed) return std::nullopt;
      return first ? 1.2 : 3.0;
    case MachineClass::small_induction:
      if (!first || small == SmallMotors::omitted) return std::nullopt;
      return 1.67;
  }
  return std::nullopt;
}

double one_motor_hp(const InductionMotor& m) {
  if (m.rated_hp) return *m.rated_hp;
  if (m.rated_kw) return *m.rated_kw / kKwPerHp;
  if (m.rated_mw) return *m.rated_mw * 1000 / kKwPerHp;
  if (m.power_factor && m.efficiency_percent)
    return *m.rated_mva * 1000 * *m.power_factor * *m.efficiency_percent / 100 / kKwPerHp;
  return *m.rated_mva * 1000;
}

MachineClass class_of(const InductionMotor& motor) {
  const double hp = one_motor_hp(motor);
  const bool two_pole = motor.pole_pairs.value_or(1) == 1;
  if (hp > kLargeHp || (two_pole && hp > kTwoPoleLargeHp)) return MachineClass::large_induction;
  return hp < 50 ? MachineClass::small_induction : MachineClass::medium_induction;
}

std::vector<DefaultUse> assumed_of_motors(const Network& network) {
  DefaultUse speed{
      "pole_pairs", "1 (larger current: X\" of a large motor)", "common practice, no source", {}};
  DefaultUse power{
      "rated_hp", "1 hp per kVA (no power factor and efficiency)", "common practice, no source", {}};
  for (std::uint32_t i = 0; i < network.induction_motors.size(); ++i) {
    const InductionMotor& m = network.induction_motors[i];
    if (!is_live(network, m, m.bus) || !m.drives_fault_current()) continue;
    const double hp = one_motor_hp(m);
    if (!m.pole_pairs && hp > kTwoPoleLargeHp && hp <= kLargeHp)
      speed.elements.push_back({ElementKind::induction_motor, i});
    if (m.rated_mva && !(m.power_factor && m.efficiency_percent))
      power.elements.push_back({ElementKind::induction_motor, i});
  }
  std::vector<DefaultUse> used;
  for (DefaultUse* one : {&speed, &power})
    if (!one->elements.empty()) used.push_back(std::move(*one));
  return used;
}

MachineClass class_of(const SynchronousMachine& machine) {
  if (machine.role == MachineRole::motor) return MachineClass::synchronous_motor;
  return machine.rotor == Rotor::salient_pole && machine.damper_winding == false
             ? MachineClass::hydro_without_dampers
             : MachineClass::generator;
}

std::vector<MachineReactance> machine_reactances(const Network& network, DutyNetwork which, SmallMotors small,
                                                 std::vector<Finding>& missing) {
  std::vector<MachineReactance> list;
  for (std::uint32_t i = 0; i < network.synchronous_machines.size(); ++i) {
    const SynchronousMachine& m = network.synchronous_machines[i];
    if (!is_live(network, m, m.bus)) continue;
    const ElementRef ref{ElementKind::synchronous_machine, i};
    const MachineClass kind = class_of(m);
    double ratio = 1;
    if (m.xd_transient_percent)
      ratio = *m.xd_transient_percent / m.xd_subtransient_percent;
    else if (needs_transient(kind, which))
      missing.push_back({Severity::error, ref, "xd_transient_percent", "missing",
                         which == DutyNetwork::delayed
                             ? "the network of about 30 cycles needs it"
                             : "a machine without damper winding counts with 0.75 of it",
                         "give X'd of the machine's data sheet"});
    list.push_back({ref, kind, reactance_factor(kind, which, small, ratio)});
  }
  for (std::uint32_t i = 0; i < network.induction_motors.size(); ++i) {
    const InductionMotor& m = network.induction_motors[i];
    if (!is_live(network, m, m.bus) || !m.drives_fault_current()) continue;
    const MachineClass kind = class_of(m);
    list.push_back({{ElementKind::induction_motor, i}, kind, reactance_factor(kind, which, small, 1)});
  }
  return list;
}

void apply(const std::vector<MachineReactance>& reactances, Network& network) {
  for (const MachineReactance& r : reactances) {
    if (!r.factor) {
      element(network, r.element).in_service = false;
    } else if (r.element.kind == ElementKind::synchronous_machine) {
      SynchronousMachine& m = network.synchronous_machines[r.element.index];
      const bool whole = r.machine_class == MachineClass::synchronous_motor;
      if (!whole && m.x_over_r) {  // the resistance stays when X'd stands for X"d
        m.ra_percent = m.xd_subtransient_percent / *m.x_over_r;
        m.x_over_r.reset();
      }
      m.xd_subtransient_percent *= *r.factor;
      if (whole && m.ra_percent) *m.ra_percent *= *r.factor;
      if (whole && m.x2_percent) *m.x2_percent *= *r.factor;
    } else {
      *network.induction_motors[r.element.index].locked_rotor_ratio /= *r.factor;
    }
  }
}

}  // namespace kiloamp::ieee_c37
