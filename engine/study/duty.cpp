#include "engine/study/duty.hpp"

#include <algorithm>
#include <atomic>
#include <cmath>

#include "engine/network/terminals.hpp"
#include "engine/sparse/run_tasks.hpp"
#include "engine/standard/iec60909/formulas.hpp"
#include "engine/study/duty_feeds.hpp"
#include "engine/study/duty_rules.hpp"
#include "engine/study/duty_standing.hpp"
#include "engine/study/duty_states.hpp"
#include "engine/study/rounded_text.hpp"

namespace kiloamp {

namespace {

using detail::DeviceStanding;
using detail::Loading;
using detail::Outcome;
using detail::Rule;
using detail::RuleFacts;
using detail::Standing;
using detail::Through;

constexpr std::size_t kFeeds = 5;

// A device, and what its standard compares.
struct Judged {
  ElementRef ref;
  const Device* device;
  std::vector<Rule> rules;
};

// A part of a fault's current, its own X/R, and both in C37's interrupting network.
struct Part {
  double ka = 0, interrupting_ka = 0;
  std::optional<double> x_over_r, interrupting_x_over_r;
};

BySequence<Complex> less(const BySequence<Complex>& total, const BySequence<Complex>& own) {
  return {total[0] - own[0], total[1] - own[1], total[2] - own[2]};
}

// Current of an element into the faulted bus; empty: it has no part in that network.
std::optional<BySequence<Complex>> own_current(const FaultResult& fault, ElementRef branch) {
  for (const Contribution& c : fault.contributions)
    if (c.element == branch) return c.sequence_ka;
  return std::nullopt;
}

// The branch is there, although it may feed nothing (a motor behind a converter, one that has died away).
bool is_connected(const Network& n, ElementRef branch) {
  const auto buses = buses_of(n, branch);
  return element(n, branch).is_in_service() &&
         (branch.kind != ElementKind::bus_switch || n.switches[branch.index].closed) &&
         std::all_of(buses.begin(), buses.end(), [&](BusIndex b) { return n.bus(b).is_in_service(); });
}

class Duty {
 public:
  Duty(const Network& network, const DutyOptions& options) : network_(network), options_(options) {
    table_.states = detail::duty_states(network, options);
    list_devices();
  }

  DutyTable run();

 private:
  using Standings = std::vector<DeviceStanding>;

  void list_devices();
  [[nodiscard]] Standings fresh() const;
  [[nodiscard]] StudyOptions study_options(DeviceFamily family, const DutyState& state, int threads) const;
  [[nodiscard]] std::vector<std::uint32_t>& of(DeviceFamily family) {
    return of_family_[static_cast<std::size_t>(family)];
  }
  void judge_state(std::size_t state, DeviceFamily family, int threads, Standings& standings);
  /// Currents of the three-phase fault at the bus at hand.
  struct ThreePhase {
    double ka = 1, interrupting_ka = 0;
  };
  void judge_bus(std::size_t state, const StudiedFault& fault, const FaultResult* interrupting,
                 std::span<const std::uint32_t> devices, const ThreePhase& three_phase,
                 Standings& standings) const;
  void judge(std::size_t state, const Judged& judged, const Through& through, DeviceStanding& standing) const;
  [[nodiscard]] RuleFacts facts_of(const Device& device) const;
  void conclude(Standings& standings);
  void find_feeds(int threads);

  const Network& network_;
  const DutyOptions& options_;
  std::vector<Judged> judged_;
  std::array<std::vector<std::uint32_t>, 2> of_family_;  // into judged_, by bus
  std::vector<double> parting_s_;
  DutyTable table_;
};

RuleFacts Duty::facts_of(const Device& d) const {
  RuleFacts facts{network_.frequency_hz, options_.study.iec60909.duration_s, {}};
  if (d.branch && d.branch->kind == ElementKind::synchronous_machine) {
    const SynchronousMachine& m = network_.synchronous_machines[d.branch->index];
    facts.machine_r_over_x = iec60909::fictitious_r_over_xd(m.rated_kv, m.rated_mva);
  }
  return facts;
}

// A device counts when it is in service in some state.
void Duty::list_devices() {
  std::vector<Network> networks;
  for (const DutyState& state : table_.states) {
    if (state.outage) continue;
    networks.push_back(network_);
    if (state.scenario) apply_scenario(networks.back(), *state.scenario);
  }
  const auto is_ever_live = [&](ElementRef ref, const Device& d) {
    return std::any_of(networks.begin(), networks.end(), [&](const Network& n) {
      return element(n, ref).is_in_service() && n.bus(d.bus).is_in_service();
    });
  };
  const auto add = [&](ElementKind kind, const auto& section) {
    for (std::uint32_t i = 0; i < section.size(); ++i) {
      const Device& d = section[i];
      if (!is_ever_live({kind, i}, d)) {
        table_.warnings.push_back(std::string(kind_name(kind)) + " " + d.id +
                                  " out of service in every state: not judged");
        continue;
      }
      const RuleFacts facts = facts_of(d);
      const DeviceFamily family = family_of(d.standard);
      const auto index = static_cast<std::uint32_t>(judged_.size());
      judged_.push_back(
          {{kind, i},
           &d,
           family == DeviceFamily::iec ? detail::iec_rules(d, facts) : detail::c37_rules(d, facts)});
      if (options_.family && *options_.family != family) {
        for (Rule& rule : judged_.back().rules) {
          rule.evaluate = nullptr;
          rule.missing = family == DeviceFamily::iec ? "the IEC calculation, left out of this run"
                                                     : "the ANSI/IEEE calculation, left out of this run";
        }
        continue;
      }
      of(family).push_back(index);
      if (const auto parting = detail::parting_time_s(d, network_.frequency_hz))
        parting_s_.push_back(*parting);
    }
  };
  add(ElementKind::breaker, network_.breakers);
  add(ElementKind::fuse, network_.fuses);
  add(ElementKind::switchboard, network_.switchboards);
  for (auto& list : of_family_)
    std::stable_sort(list.begin(), list.end(),
                     [&](auto a, auto b) { return at(judged_[a].device->bus) < at(judged_[b].device->bus); });
  std::sort(parting_s_.begin(), parting_s_.end());
  parting_s_.erase(std::unique(parting_s_.begin(), parting_s_.end()), parting_s_.end());
}

Duty::Standings Duty::fresh() const {
  Standings standings(judged_.size());
  for (std::size_t d = 0; d < judged_.size(); ++d) standings[d].rules.resize(judged_[d].rules.size());
  return standings;
}

StudyOptions Duty::study_options(DeviceFamily family, const DutyState& state, int threads) const {
  StudyOptions options = options_.study;
  options.method = family == DeviceFamily::iec ? Method::iec60909 : Method::c37;
  options.case_kind = CaseKind::max;
  options.scenario = state.outage ? std::nullopt : state.scenario;  // an outage is applied after its scenario
  options.kinds.assign(kAllFaults.begin(), kAllFaults.end());
  options.phase_ohm = options.earth_ohm = 0;
  options.fault = {};
  options.threads = threads;
  options.iec60909.parting_s = parting_s_;
  options.judges_devices = true;
  if (family == DeviceFamily::iec) {
    options.prefault = PrefaultAsGiven{};
    options.include_shunts = false;
  }
  options.buses.clear();
  for (const auto d : of_family_[static_cast<std::size_t>(family)])
    if (options.buses.empty() || options.buses.back() != judged_[d].device->bus)
      options.buses.push_back(judged_[d].device->bus);
  return options;
}

void Duty::judge_state(std::size_t state, DeviceFamily family, int threads, Standings& standings) {
  const Study study(detail::in_state(network_, table_.states[state]),
                    study_options(family, table_.states[state], threads));
  if (state == 0) {
    for (const DefaultUse& use : study.defaults_used())  // both families fill the same ones in
      if (std::none_of(table_.defaults.begin(), table_.defaults.end(), [&](const DefaultUse& known) {
            return known.field == use.field && known.value == use.value;
          }))
        table_.defaults.push_back(use);
    for (const std::string& warning : study.warnings())
      if (std::find(table_.warnings.begin(), table_.warnings.end(), warning) == table_.warnings.end())
        table_.warnings.push_back(warning);
  }
  // Buses in pieces of equal count; each device belongs to one bus, so that threads do not meet.
  const auto& buses = study.wanted_buses();
  const std::vector<std::uint32_t>& devices = of(family);
  std::vector<std::size_t> first(buses.size() + 1, devices.size());
  for (std::size_t b = 0, d = 0; b < buses.size(); ++b) {
    first[b] = d;
    while (d < devices.size() && judged_[devices[d]].device->bus == buses[b]) ++d;
  }
  constexpr std::size_t kInTask = 32;
  struct Thread {
    FaultLoop loop;
    FaultSolver::WorkspacePtr workspace;
    FaultResult interrupting;
  };
  std::vector<std::optional<Thread>> own(static_cast<std::size_t>(std::max(1, threads)));
  sparse::run_tasks(
      static_cast<int>((buses.size() + kInTask - 1) / kInTask), threads, [&](int task, int thread) {
        auto& mine = own[static_cast<std::size_t>(thread)];
        if (!mine) {
          mine.emplace(Thread{FaultLoop(study), {}, {}});
          if (study.c37() != nullptr) mine->workspace = study.c37()->interrupting().make_workspace();
        }
        for (std::size_t b = static_cast<std::size_t>(task) * kInTask;
             b < std::min(buses.size(), (static_cast<std::size_t>(task) + 1) * kInTask); ++b) {
          const auto here = std::span(devices).subspan(first[b], first[b + 1] - first[b]);
          ThreePhase three_phase;
          mine->loop.at_bus(buses[b], [&](const StudiedFault& fault) {
            const FaultResult* interrupting = fault.c37 != nullptr ? &mine->interrupting : nullptr;
            if (interrupting != nullptr)
              study.c37()->interrupting().solve(fault.result.fault, {}, *mine->workspace, mine->interrupting);
            if (fault.result.fault.kind == FaultKind::three_phase && fault.result.current_ka > 0)
              three_phase = {fault.result.current_ka, interrupting != nullptr ? interrupting->current_ka : 0};
            judge_bus(state, fault, interrupting, here, three_phase, standings);
          });
        }
      });
}

void Duty::judge_bus(std::size_t state, const StudiedFault& fault, const FaultResult* interrupting,
                     std::span<const std::uint32_t> devices, const ThreePhase& three_phase,
                     Standings& standings) const {
  const FaultResult& result = fault.result;
  if (!result.has_source || result.current_ka == 0) return;
  const Network& now = fault.study->network();
  Through through;
  through.kind = result.fault.kind;
  through.fault = &fault;
  detail::FaultInTime in_time(fault);
  through.in_time = &in_time;
  const double converters_ka = fault.iec60909 != nullptr ? fault.iec60909->converter_ka : 0;
  const Part whole{
      result.current_ka + converters_ka, interrupting != nullptr ? interrupting->current_ka : 0, {}, {}};
  through.bus_ka = whole.ka;
  through.operating_kv = result.prefault_kv * std::sqrt(3.0);
  through.of_three_phase = std::max(result.current_ka / three_phase.ka,
                                    interrupting != nullptr && three_phase.interrupting_ka > 0
                                        ? interrupting->current_ka / three_phase.interrupting_ka
                                        : 0);
  const auto part = [&](const BySequence<Complex>& first, const BySequence<Complex>& later) {
    Part p{
        largest_phase(first) + converters_ka, largest_phase(later), detail::own_x_over_r(result, first), {}};
    if (interrupting != nullptr) p.interrupting_x_over_r = detail::own_x_over_r(*interrupting, later);
    return p;
  };
  for (const auto d : devices) {
    const Judged& judged = judged_[d];
    if (!element(now, judged.ref).is_in_service()) continue;
    const auto judge_part = [&](DutySide side, const Part& p, bool loop = false) {
      through.side = side;
      through.ka = p.ka;
      through.interrupting_ka = p.interrupting_ka;
      through.own_x_over_r = p.x_over_r;
      through.own_interrupting_x_over_r = p.interrupting_x_over_r;
      through.in_switch_loop = loop;
      judge(state, judged, through, standings[d]);
    };
    const auto& branch = judged.device->branch;
    if (!branch) {
      judge_part(DutySide::total, whole);
      continue;
    }
    if (!is_connected(now, *branch)) continue;
    if (branch->kind == ElementKind::bus_switch &&
        detail::far_side(fault.study->model(), result.fault.bus, *branch).empty()) {
      judge_part(DutySide::beyond, whole, true);  // the last of several ways to open carries everything
      continue;
    }
    const auto own = own_current(result, *branch).value_or(BySequence<Complex>{});
    BySequence<Complex> own_later{}, rest_later{};
    if (interrupting != nullptr) {
      own_later = own_current(*interrupting, *branch).value_or(BySequence<Complex>{});
      rest_later = less(interrupting->sequence_ka, own_later);
    }
    judge_part(DutySide::beyond, part(less(result.sequence_ka, own), rest_later));
    judge_part(DutySide::own, part(own, own_later));
  }
}

void Duty::judge(std::size_t state, const Judged& judged, const Through& through,
                 DeviceStanding& standing) const {
  static constexpr double kRounded = 1.0001;
  const auto& rated_kv = judged.device->rated_kv;
  const bool above_rated =
      through.fault->c37 != nullptr && rated_kv && through.operating_kv > kRounded * *rated_kv;
  for (std::size_t r = 0; r < judged.rules.size(); ++r) {
    const Rule& rule = judged.rules[r];
    if (!rule.evaluate) continue;
    Outcome outcome = above_rated
                          ? Outcome("operating voltage " + detail::rounded_text(through.operating_kv, 2) +
                                    " kV above rated_kv")
                          : rule.evaluate(through);
    Standing one;
    if (auto* why = std::get_if<std::string>(&outcome)) {
      one.check.state = SIZE_MAX;
      one.blocked = std::move(*why);
      one.blocked_state = state;
      standing.rules[r].merge(std::move(one));
      continue;
    }
    Loading& loading = std::get<Loading>(outcome);
    if (through.in_switch_loop)
      loading.note = detail::joined(loading.note,
                                    "one of several closed ways between its buses: the whole current, "
                                    "which the last to open carries");
    one.loading = loading.rank.value_or(loading.duty / loading.rating);
    one.check = {rule.quantity,        Verdict::within,        std::move(loading.undecided),
                 loading.duty,         loading.rating,         state,
                 through.kind,         through.side,           loading.through_ka,
                 loading.x_over_r,     loading.factor,         loading.nacd,
                 loading.interrupting, std::move(loading.note)};
    if (loading.linear && through.side != DutySide::own && loading.duty > 0)
      standing.headroom_ka =
          std::min(standing.headroom_ka,
                   loading.through_ka * (loading.rating / loading.duty - 1) / through.of_three_phase);
    standing.rules[r].merge(std::move(one));
  }
  if (through.fault->c37 == nullptr || through.interrupting_ka < standing.finding_ka) return;
  if (through.interrupting_ka == standing.finding_ka && state >= standing.finding_state) return;
  standing.finding = detail::simplified_finding(*judged.device, through);
  standing.finding_ka = through.interrupting_ka;
  standing.finding_state = state;
}

void Duty::conclude(Standings& standings) {
  for (std::size_t d = 0; d < judged_.size(); ++d) {
    DeviceDuty duty = detail::concluded(judged_[d].ref, judged_[d].rules, std::move(standings[d]),
                                        network_.bus(judged_[d].device->bus).nominal_kv, options_.marginal);
    const auto& branch = judged_[d].device->branch;
    if (judged_[d].ref.kind == ElementKind::breaker && branch &&
        branch->kind == ElementKind::synchronous_machine)
      duty.findings.emplace_back(
          "at a machine's terminals: what IEC/IEEE 62271-37-013 asks of a generator breaker "
          "beyond these checks is not evaluated");
    ++table_.count[static_cast<std::size_t>(duty.verdict)];
    table_.devices.push_back(std::move(duty));
  }
  detail::sort_worst_first(table_.devices);
}

// The states that govern, once more.
void Duty::find_feeds(int threads) {
  std::vector<std::tuple<DeviceFamily, std::size_t, std::size_t>> wanted;  // family, state, row
  for (std::size_t row = 0; row < table_.devices.size(); ++row) {
    const DeviceDuty& d = table_.devices[row];
    if (d.governing)
      wanted.emplace_back(family_of(device(network_, d.device).standard), d.checks[*d.governing].state, row);
  }
  std::sort(wanted.begin(), wanted.end());
  for (std::size_t first = 0, last = 0; first < wanted.size(); first = last) {
    const auto [family, state, row] = wanted[first];
    while (last < wanted.size() && std::get<0>(wanted[last]) == family && std::get<1>(wanted[last]) == state)
      ++last;
    const Study study(detail::in_state(network_, table_.states[state]),
                      study_options(family, table_.states[state], threads));
    const FaultSolver& interrupting = study.c37() != nullptr ? study.c37()->interrupting() : study.solver();
    struct Finders {
      detail::FeedFinder first, interrupting;
    };
    std::vector<std::optional<Finders>> finders(static_cast<std::size_t>(threads));
    constexpr std::size_t kInTask = 16;
    const auto tasks = static_cast<int>((last - first + kInTask - 1) / kInTask);
    sparse::run_tasks(tasks, threads, [&, from = first, to = last](int task, int thread) {
      auto& finder = finders[static_cast<std::size_t>(thread)];
      if (!finder)
        finder.emplace(Finders{detail::FeedFinder(study.solver()), detail::FeedFinder(interrupting)});
      const std::size_t start = from + static_cast<std::size_t>(task) * kInTask;
      for (std::size_t i = start; i < std::min(to, start + kInTask); ++i) {
        DeviceDuty& d = table_.devices[std::get<2>(wanted[i])];
        const Device& data = device(network_, d.device);
        const DutyCheck& check = d.checks[*d.governing];
        const auto split = [&](detail::FeedFinder& in) {
          d.feeds = in.split(data.bus, data.branch, check.side, check.through_ka, kFeeds);
        };
        if (const auto inside = study.inside_unit(data.bus)) {
          detail::FeedFinder own(inside->solver());
          split(own);
        } else {
          split(check.interrupting ? finder->interrupting : finder->first);
        }
      }
    });
  }
}

DutyTable Duty::run() {
  const int threads = std::max(1, options_.study.threads);
  const bool side_by_side = options_.outages;  // many small studies, a thread each
  const int outer = side_by_side ? threads : 1, inner = side_by_side ? 1 : threads;
  table_.used_iec = !of(DeviceFamily::iec).empty();
  table_.used_c37 = !of(DeviceFamily::ansi).empty();
  std::vector<Standings> standings(static_cast<std::size_t>(outer));
  std::atomic<std::size_t> done{0};
  sparse::run_tasks(static_cast<int>(table_.states.size()), outer, [&](int task, int thread) {
    Standings& own = standings[static_cast<std::size_t>(thread)];
    if (own.empty()) own = fresh();
    for (const DeviceFamily family : {DeviceFamily::iec, DeviceFamily::ansi})
      if (!of(family).empty()) judge_state(static_cast<std::size_t>(task), family, inner, own);
    ++done;
    if (thread == 0 && options_.progress) options_.progress(done, table_.states.size());
  });
  Standings all = fresh();
  for (Standings& one : standings)
    for (std::size_t d = 0; d < one.size(); ++d) all[d].merge(std::move(one[d]));
  conclude(all);
  find_feeds(threads);
  return std::move(table_);
}

}  // namespace

DutyTable duty(const Network& network, const DutyOptions& options) { return Duty(network, options).run(); }

}  // namespace kiloamp
