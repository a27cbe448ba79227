#include "engine/study/study.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>

#include "engine/study/rounded_text.hpp"

namespace kiloamp {

namespace {

std::vector<Prefault> prefault_of(const Network& network, const StudyOptions& options) {
  std::vector<Prefault> prefault(network.buses.size());
  for (std::size_t b = 0; b < prefault.size(); ++b) {
    const Bus& bus = network.buses[b];
    if (options.method == Method::iec60909) {
      prefault[b].pu = iec60909::voltage_factor(bus, options.case_kind, options.iec60909.edition);
      continue;
    }
    if (const auto* value = std::get_if<PrefaultValue>(&options.prefault)) prefault[b].pu = value->pu;
    if (!std::holds_alternative<PrefaultAsGiven>(options.prefault)) continue;
    prefault[b].pu = bus.prefault_pu.value_or(network.prefault_pu.value_or(1.0));
    prefault[b].deg = bus.prefault_deg;
  }
  return prefault;
}

std::string counted(std::size_t count, const char* one, const char* many) {
  return std::to_string(count) + " " + (count == 1 ? one : many);
}

template <typename Section>
std::size_t live_count(const Section& section) {
  return static_cast<std::size_t>(
      std::count_if(section.begin(), section.end(), [](const auto& e) { return e.is_in_service(); }));
}

// Elements that are in the case and that a fault study does not use.
void warn_of_unused(const Network& n, const StudyOptions& options, std::vector<std::string>& warnings) {
  const auto converters = static_cast<std::size_t>(
      std::count_if(n.inverter_sources.begin(), n.inverter_sources.end(),
                    [](const auto& source) { return source.is_in_service() && !source.doubly_fed; }));
  if (converters > 0 && options.method != Method::iec60909)
    warnings.push_back(counted(converters, "inverter source", "inverter sources") +
                       " left out: a voltage behind an impedance does not describe them");
  const auto drives = static_cast<std::size_t>(
      std::count_if(n.induction_motors.begin(), n.induction_motors.end(),
                    [](const auto& m) { return m.is_in_service() && !m.drives_fault_current(); }));
  if (drives > 0)
    warnings.push_back(counted(drives, "converter-fed motor", "converter-fed motors") +
                       " left out: feeds_back is not set");
  if (options.case_kind == CaseKind::min && !n.inverter_sources.empty())
    warnings.push_back(counted(n.inverter_sources.size(), "inverter source", "inverter sources") +
                       " left out: smallest currents are wanted");
  if (options.case_kind == CaseKind::min && !n.induction_motors.empty())
    warnings.push_back(
        counted(n.induction_motors.size(), "induction motor entry", "induction motor entries") +
        " left out: smallest currents are wanted");
  if (const auto count = live_count(n.power_station_units); count > 0 && options.method != Method::iec60909)
    warnings.push_back(counted(count, "power station unit", "power station units") +
                       " taken as separate machine and transformer: this method has no common correction");
  const auto decaying = static_cast<std::size_t>(std::count_if(
      n.synchronous_machines.begin(), n.synchronous_machines.end(), [](const SynchronousMachine& m) {
        return m.is_in_service() &&
               (m.xd_transient_percent || m.td_subtransient_s || m.td_transient_s || m.ta_s);
      }));
  if (decaying > 0)
    warnings.push_back(
        (options.method == Method::c37 ? "synchronous reactances and time constants of "
                                       : "transient and synchronous reactances, rotor and time "
                                         "constants of ") +
        counted(decaying, "machine", "machines") + " not used: this study follows no decay in time");
  const auto devices = live_count(n.breakers) + live_count(n.fuses) + live_count(n.switchboards);
  if (devices > 0 && !options.judges_devices)
    warnings.push_back(counted(devices, "breaker, fuse or switchboard", "breakers, fuses and switchboards") +
                       " not judged: this study computes currents; kiloamp duty judges devices");
  if (const auto count = live_count(n.relays))
    warnings.push_back(counted(count, "relay", "relays") + " not evaluated in this study");
  const auto shunts =
      static_cast<std::size_t>(std::count_if(n.shunts.begin(), n.shunts.end(), [](const Shunt& s) {
        return s.is_in_service() && !s.grounded.value_or(false);
      }));
  if (shunts > 0 && !options.include_shunts)
    warnings.push_back(
        counted(shunts, "shunt without earthed star point", "shunts without earthed star point") +
        " left out, as is usual in fault studies");
}

void warn_of_model(const Network& n, const SequenceModel& model, const SolutionQuality& quality,
                   std::vector<std::string>& warnings) {
  std::size_t dead = 0, no_earth = 0;
  std::vector<std::size_t> switches(model.node_count(), 0);
  for (std::size_t b = 0; b < n.buses.size(); ++b) {
    const Node node = model.node_of_bus[b];
    if (node == Node::none) continue;
    if (!model.has_source[at(node)])
      ++dead;
    else if (!model.has_zero_path[at(node)])
      ++no_earth;
  }
  for (const auto& s : model.closed_switches) ++switches[at(model.node_of_bus[at(s.from)])];
  std::size_t loops = 0;
  for (std::size_t node = 0; node < switches.size(); ++node)
    if (switches[node] > 0 && switches[node] >= model.buses_of(static_cast<Node>(node)).size()) ++loops;
  if (dead > 0)
    warnings.push_back(counted(dead, "bus has no source: its fault currents are 0",
                               "buses have no source: their fault currents are 0"));
  if (no_earth > 0)
    warnings.push_back(
        counted(no_earth, "bus has no zero-sequence path to earth: its earth-fault current is 0",
                "buses have no zero-sequence path to earth: their earth-fault currents are 0"));
  if (loops > 0)
    warnings.push_back(
        counted(loops, "loop of closed switches", "loops of closed switches") +
        ": the currents of its switches are shared as if every switch had the same small resistance");
  static const char* names[] = {"zero", "positive", "negative"};
  for (int s = 0; s < 3; ++s)
    if (quality[s].pivoting)
      warnings.push_back(std::string("the ") + names[s] + " sequence needed a pivoting solution");
}

}  // namespace

Study::Study(Network&& network, const StudyOptions& options)
    : network_(std::move(network)), options_(options) {
  try {
    prepare();
  } catch (...) {
    network = std::move(network_);
    throw;
  }
}

void Study::prepare() {
  const auto start = std::chrono::steady_clock::now();
  if (options_.scenario) {
    apply_scenario(network_, *options_.scenario);
    scenario_id_ = network_.scenarios[*options_.scenario].id;
  }
  const bool iec = options_.method == Method::iec60909, c37 = options_.method == Method::c37;
  if (iec && !network_.power_station_units.empty() && !options_.inside_unit) as_given_ = network_;
  defaults_ = fill_defaults(network_);
  apply_case_kind(network_, options_.case_kind);
  if (iec) correct();
  std::optional<Network> without_factors;
  if (c37) {
    const auto reactances = first_cycle_reactances();
    for (DefaultUse& use : ieee_c37::assumed_of_motors(network_)) defaults_.push_back(std::move(use));
    without_factors = network_;
    ieee_c37::apply(reactances, network_);
  }
  model_ = build_sequence_model(network_, {options_.include_shunts, c37});
  wanted_ = options_.buses;
  for (std::size_t b = 0; b < network_.buses.size() && options_.buses.empty(); ++b)
    if (network_.buses[b].is_in_service()) wanted_.push_back(static_cast<BusIndex>(b));
  const auto modelled = std::chrono::steady_clock::now();
  solver_ = std::make_unique<FaultSolver>(model_, prefault_of(network_, options_), options_.threads);
  if (iec)
    evaluation_ = std::make_unique<iec60909::Evaluation>(network_, *solver_, options_.iec60909,
                                                         options_.case_kind, options_.threads);
  if (c37)
    c37_ = std::make_unique<ieee_c37::Evaluation>(*without_factors, *solver_, prefault_of(network_, options_),
                                                  SequenceOptions{options_.include_shunts}, options_.c37,
                                                  options_.threads);
  using Milliseconds = std::chrono::duration<double, std::milli>;
  timing_ = {Milliseconds(modelled - start).count(),
             Milliseconds(std::chrono::steady_clock::now() - modelled).count()};
  find_insides();
  warn_of_unused(network_, options_, warnings_);
  if (evaluation_)
    warnings_.insert(warnings_.end(), evaluation_->notes().begin(), evaluation_->notes().end());
  if (c37_) {
    warnings_.insert(warnings_.end(), c37_->notes().begin(), c37_->notes().end());
    warn_of_x_over_r();
  }
  for (const DefaultUse& use : defaults_)
    if (use.field == "r0_ohm_per_km, x0_ohm_per_km")
      warnings_.push_back("earth-fault currents rest on assumed zero-sequence data of " +
                          counted(use.elements.size(), "line", "lines") + " (" + use.value + ")");
  warn_of_model(network_, model_, solver_->quality(), warnings_);
}

void Study::correct() {
  std::vector<Finding> missing;
  corrections_ = iec60909::corrections(network_, options_.case_kind, options_.iec60909.edition,
                                       options_.inside_unit, missing);
  if (!missing.empty()) throw NetworkError(std::move(missing));
  std::size_t tapped = 0;
  for (const Transformer& t : network_.transformers) tapped += t.tap ? 1 : 0;
  for (const ThreeWindingTransformer& t : network_.three_winding_transformers) tapped += t.tap ? 1 : 0;
  if (tapped > 0)
    warnings_.push_back(counted(tapped, "tap position", "tap positions") +
                        " not used: IEC 60909-0 takes the main position");
  iec60909::apply(corrections_, network_);
  DefaultUse tolerance{"voltage_tolerance_percent", "10", "IEC 60038 (from memory)", {}};
  for (std::uint32_t b = 0; b < network_.buses.size(); ++b)
    if (network_.buses[b].nominal_kv <= 1 && !network_.buses[b].voltage_tolerance_percent)
      tolerance.elements.push_back({ElementKind::bus, b});
  if (!tolerance.elements.empty()) defaults_.push_back(std::move(tolerance));
}

std::vector<ieee_c37::MachineReactance> Study::first_cycle_reactances() const {
  std::vector<Finding> missing;
  auto reactances = ieee_c37::machine_reactances(network_, ieee_c37::DutyNetwork::first_cycle,
                                                 options_.c37.small_motors, missing);
  if (!missing.empty()) throw NetworkError(std::move(missing));
  return reactances;
}

void Study::warn_of_x_over_r() {
  std::size_t count = 0;
  double most = 0;
  std::string worst;
  for (const BusIndex bus : wanted_) {
    const auto z = solver_->thevenin_pu(bus);
    const auto parts = c37_->separate(ieee_c37::DutyNetwork::first_cycle).at_bus(bus);
    if (!z || !parts || !(z->z1.real() > 0) || !(z->z1.imag() > 0)) continue;
    const ieee_c37::NetworkCurrent ratios{0, 0, parts->x_over_r(FaultKind::three_phase),
                                          z->z1.imag() / z->z1.real()};
    if (!ieee_c37::x_over_r_differ(ratios)) continue;
    ++count;
    const double times = *ratios.x_over_r / *ratios.complex_x_over_r;
    if (std::max(times, 1 / times) <= most) continue;
    most = std::max(times, 1 / times);
    worst = network_.bus(bus).id + ": " + detail::rounded_text(*ratios.x_over_r, 1) + " against " +
            detail::rounded_text(*ratios.complex_x_over_r, 1);
  }
  if (count > 0)
    warnings_.push_back(
        "at " + counted(count, "bus", "buses") +
        " X/R of the separate X and R networks, which the standards ask for, differs by more than a "
        "tenth from that of the complex impedance (most at " +
        worst + "): in a mesh the two reductions are not the same network");
}

void Study::find_insides() {
  if (!as_given_) return;
  std::vector<bool> corrected(network_.synchronous_machines.size(), false);
  for (const iec60909::Correction& c : corrections_)
    if (c.element.kind == ElementKind::synchronous_machine) corrected[c.element.index] = true;
  for (std::uint32_t u = 0; u < network_.power_station_units.size(); ++u) {
    const PowerStationUnit& unit = network_.power_station_units[u];
    const SynchronousMachine& machine = network_.synchronous_machines[unit.machine];
    const Transformer& t = network_.transformers[unit.transformer];
    if (unit.is_in_service() && corrected[unit.machine] && is_live(network_, t, t.hv_bus, t.lv_bus))
      inside_.emplace_back(model_.node_of_bus[at(machine.bus)], u);
  }
  std::sort(inside_.begin(), inside_.end());
}

std::unique_ptr<Study> Study::inside_unit(BusIndex bus) const {
  const Node node = model_.node_of_bus[at(bus)];
  const auto found = std::lower_bound(inside_.begin(), inside_.end(), node,
                                      [](const auto& entry, Node wanted) { return entry.first < wanted; });
  if (found == inside_.end() || found->first != node) return nullptr;
  StudyOptions options = options_;
  options.scenario.reset();  // as_given_ is in its state
  options.inside_unit = found->second;
  options.buses = {bus};
  return std::make_unique<Study>(Network(*as_given_), options);
}

void FaultLoop::at_bus(BusIndex bus, const FaultVisit& visit) {
  if (const auto inside = study_->inside_unit(bus)) return FaultLoop(*inside).at_bus(bus, visit);
  const StudyOptions& options = study_->options();
  for (const FaultKind kind : options.kinds) {
    study_->solver().solve({bus, kind, options.phase_ohm, options.earth_ohm}, options.fault, *workspace_,
                           result_);
    const bool inside = options.inside_unit.has_value();
    if (const auto* evaluation = study_->iec60909()) {
      const iec60909::Quantities quantities = evaluation->of(result_);
      visit({study_, result_, options.case_kind, &quantities, nullptr, inside});
    } else if (const auto* c37 = study_->c37()) {
      const ieee_c37::Quantities quantities = c37->of(result_);
      visit({study_, result_, options.case_kind, nullptr, &quantities, inside});
    } else {
      visit({study_, result_, options.case_kind, nullptr, nullptr, inside});
    }
  }
}

void Study::for_each_fault(const FaultVisit& visit) const {
  FaultLoop loop(*this);
  for (const BusIndex bus : wanted_) loop.at_bus(bus, visit);
}

const char* fault_name(FaultKind kind) {
  switch (kind) {
    case FaultKind::three_phase:
      return "three_phase";
    case FaultKind::line_to_ground:
      return "line_to_ground";
    case FaultKind::line_to_line:
      return "line_to_line";
    case FaultKind::double_line_to_ground:
      return "double_line_to_ground";
  }
  return "";
}

const std::vector<std::string>& cautions() {
  static const std::vector<std::string> text{
      "Currents are prospective: those of a bolted fault, or one through the impedance stated, at the "
      "prefault voltage stated. A real event may differ.",
      "Results hold for the network state named here and for no other. Normally open points are open; "
      "interlocks are assumed to work.",
      "Source data change: confirm the grid's fault levels with its operator, with date and validity, before "
      "use and at every change.",
      "The fault level of a bus is not the duty of each device at that bus. Compare quantities of IEC "
      "methods with IEC ratings and ANSI/IEEE ones with ANSI/IEEE ratings.",
      "A symmetrical current alone does not prove a device: X/R, peak and making duty, and short-time "
      "withstand are separate checks.",
      "The largest current is not safe for setting protection and the smallest not for ratings. This is "
      "neither an arc-flash nor a coordination study.",
      "Near generators and inverters the current decays and depends on excitation and control: obtain the "
      "maker's data or tests.",
      "Zero-sequence results rest on vector groups, neutral earthing, cable screens and mutual coupling as "
      "given. Arcs, evolving faults, recovery voltages, ferroresonance and earth-grid safety are outside.",
      "Equipment ratings and protection settings are to be decided under the local codes by a licensed or "
      "otherwise qualified engineer, who must check this study.",
  };
  return text;
}

}  // namespace kiloamp
