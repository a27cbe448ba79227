#include "engine/study/duty.hpp"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>

#include "engine/sparse/run_tasks.hpp"
#include "engine/study/duty_feeds.hpp"
#include "engine/study/duty_rules.hpp"

namespace kiloamp {

namespace {

using detail::Loading;
using detail::Outcome;
using detail::Rule;
using detail::RuleFacts;
using detail::Through;

constexpr std::size_t kFeeds = 5;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

// What is known of one rule of one device so far. Of equal loadings the first state, kind and side stay, so
// that the order of threads does not show.
struct Standing {
  double loading = -1;
  DutyCheck check;
  std::string blocked;  // why some fault could not be judged; of the first such state
  std::size_t blocked_state = SIZE_MAX;

  [[nodiscard]] auto order() const { return std::tuple(check.state, check.kind, check.side); }
  void merge(Standing&& other) {
    if (other.loading > loading || (other.loading == loading && other.order() < order())) {
      loading = other.loading;
      check = std::move(other.check);
    }
    if (other.blocked_state < blocked_state) {
      blocked = std::move(other.blocked);
      blocked_state = other.blocked_state;
    }
  }
};
struct DeviceStanding {
  std::vector<Standing> rules;
  double headroom_ka = kInfinite;
  std::string finding;  // of the simplified check, at its largest interrupting current
  double finding_ka = -1;
  std::size_t finding_state = SIZE_MAX;

  void merge(DeviceStanding&& other) {
    for (std::size_t r = 0; r < rules.size(); ++r) rules[r].merge(std::move(other.rules[r]));
    headroom_ka = std::min(headroom_ka, other.headroom_ka);
    if (other.finding_ka > finding_ka ||
        (other.finding_ka == finding_ka && other.finding_state < finding_state)) {
      finding = std::move(other.finding);
      finding_ka = other.finding_ka;
      finding_state = other.finding_state;
    }
  }
};

// A device, and what its standard compares.
struct Judged {
  ElementRef ref;
  const Device* device;
  std::vector<Rule> rules;
};

double largest_phase(const BySequence<Complex>& sequence) {
  double most = 0;
  for (const Complex phase : to_phases(sequence)) most = std::max(most, std::abs(phase));
  return most;
}

// Current of an element into the faulted bus; empty: the element is not in the network of that state.
std::optional<BySequence<Complex>> own_current(const FaultResult& fault, ElementRef branch) {
  for (const Contribution& c : fault.contributions)
    if (c.element == branch) return c.sequence_ka;
  return std::nullopt;
}

double less(const BySequence<Complex>& total, const BySequence<Complex>& own) {
  return largest_phase({total[0] - own[0], total[1] - own[1], total[2] - own[2]});
}

class Duty {
 public:
  Duty(const Network& network, const DutyOptions& options) : network_(network), options_(options) {
    list_states();
    list_devices();
  }

  DutyTable run();

 private:
  using Standings = std::vector<DeviceStanding>;

  void list_states();
  void list_devices();
  [[nodiscard]] Standings fresh() const;
  [[nodiscard]] Network in_state(const DutyState& state) const;
  [[nodiscard]] StudyOptions study_options(DeviceFamily family, const DutyState& state, int threads) const;
  [[nodiscard]] std::vector<std::uint32_t>& of(DeviceFamily family) {
    return of_family_[static_cast<std::size_t>(family)];
  }
  void judge_state(std::size_t state, DeviceFamily family, int threads, Standings& standings);
  void judge_bus(std::size_t state, const StudiedFault& fault, const FaultResult* interrupting,
                 std::span<const std::uint32_t> devices, Standings& standings) const;
  void judge(std::size_t state, const Judged& judged, const Through& through, DeviceStanding& standing) const;
  void conclude(Standings& standings);
  void find_feeds(int threads);

  const Network& network_;
  const DutyOptions& options_;
  std::vector<Judged> judged_;
  std::array<std::vector<std::uint32_t>, 2> of_family_;  // into judged_, by bus
  std::vector<double> parting_s_;
  DutyTable table_;
};

void Duty::list_states() {
  const std::optional<std::size_t> first = options_.scenario;
  table_.states.push_back({first, std::nullopt});
  for (std::size_t s = 0; s < network_.scenarios.size() && !first; ++s)
    if (network_.scenarios[s].is_in_service()) table_.states.push_back({s, std::nullopt});
  if (!options_.outages) return;
  Network base = network_;
  if (first) apply_scenario(base, *first);
  for_each_section(base, [&](ElementKind kind, const auto& section) {
    if (kind != ElementKind::network_feeder && kind != ElementKind::synchronous_machine &&
        kind != ElementKind::line && kind != ElementKind::transformer &&
        kind != ElementKind::three_winding_transformer && kind != ElementKind::series_reactor &&
        kind != ElementKind::bus_switch)
      return;
    for (std::uint32_t i = 0; i < section.size(); ++i)
      if (section[i].is_in_service() && (kind != ElementKind::bus_switch || base.switches[i].closed))
        table_.states.push_back({first, ElementRef{kind, i}});
  });
}

void Duty::list_devices() {
  const RuleFacts facts{network_.frequency_hz, options_.study.iec60909.duration_s};
  const auto add = [&](ElementKind kind, const auto& section) {
    for (std::uint32_t i = 0; i < section.size(); ++i) {
      const Device& d = section[i];
      if (!d.is_in_service() || !network_.bus(d.bus).is_in_service()) continue;
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

Network Duty::in_state(const DutyState& state) const {
  Network network = network_;
  if (!state.outage) return network;
  if (state.scenario) apply_scenario(network, *state.scenario);
  if (state.outage->kind == ElementKind::bus_switch)
    network.switches[state.outage->index].closed = false;
  else
    element(network, *state.outage).in_service = false;
  return network;
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
  const Study study(in_state(table_.states[state]), study_options(family, table_.states[state], threads));
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
          mine->loop.at_bus(buses[b], [&](const StudiedFault& fault) {
            if (fault.c37 != nullptr)
              study.c37()->interrupting().solve(fault.result.fault, {}, *mine->workspace, mine->interrupting);
            judge_bus(state, fault, fault.c37 != nullptr ? &mine->interrupting : nullptr, here, standings);
          });
        }
      });
}

void Duty::judge_bus(std::size_t state, const StudiedFault& fault, const FaultResult* interrupting,
                     std::span<const std::uint32_t> devices, Standings& standings) const {
  const FaultResult& result = fault.result;
  if (!result.has_source || result.current_ka == 0) return;
  Through through;
  through.kind = result.fault.kind;
  through.fault = &fault;
  detail::FaultInTime in_time(fault);
  through.in_time = &in_time;
  const double converters_ka = fault.iec60909 != nullptr ? fault.iec60909->converter_ka : 0;
  through.bus_ka = result.current_ka + converters_ka;
  through.operating_kv = result.prefault_kv * std::sqrt(3.0);
  const double interrupting_total = interrupting != nullptr ? interrupting->current_ka : 0;
  for (const auto d : devices) {
    const Judged& judged = judged_[d];
    const auto& branch = judged.device->branch;
    if (!branch) {
      through.side = DutySide::total;
      through.ka = through.bus_ka;
      through.interrupting_ka = interrupting_total;
      judge(state, judged, through, standings[d]);
      continue;
    }
    const auto own = own_current(result, *branch);
    if (!own) continue;  // its branch is out, or its coupler open
    const auto own_later = interrupting != nullptr
                               ? own_current(*interrupting, *branch).value_or(BySequence<Complex>{})
                               : BySequence<Complex>{};
    through.side = DutySide::beyond;
    through.ka = less(result.sequence_ka, *own) + converters_ka;
    through.interrupting_ka = interrupting != nullptr ? less(interrupting->sequence_ka, own_later) : 0;
    judge(state, judged, through, standings[d]);
    through.side = DutySide::own;
    through.ka = largest_phase(*own) + converters_ka;
    through.interrupting_ka = largest_phase(own_later);
    judge(state, judged, through, standings[d]);
  }
}

void Duty::judge(std::size_t state, const Judged& judged, const Through& through,
                 DeviceStanding& standing) const {
  for (std::size_t r = 0; r < judged.rules.size(); ++r) {
    const Rule& rule = judged.rules[r];
    if (!rule.evaluate) continue;
    Outcome outcome = rule.evaluate(through);
    Standing one;
    one.check.state = one.blocked_state = state;
    if (auto* why = std::get_if<std::string>(&outcome)) {
      one.check.state = SIZE_MAX;
      one.blocked = std::move(*why);
      standing.rules[r].merge(std::move(one));
      continue;
    }
    Loading& loading = std::get<Loading>(outcome);
    one.blocked_state = SIZE_MAX;
    one.loading = loading.rank.value_or(loading.duty / loading.rating);
    one.check = {rule.quantity,          Verdict::within, std::move(loading.undecided),
                 loading.duty,           loading.rating,  state,
                 through.kind,           through.side,    loading.through_ka,
                 loading.x_over_r,       loading.factor,  loading.nacd,
                 std::move(loading.note)};
    const bool added_source_flows_through = through.side != DutySide::own;
    if (loading.linear && added_source_flows_through && through.kind == FaultKind::three_phase &&
        loading.duty > 0)
      standing.headroom_ka =
          std::min(standing.headroom_ka, loading.through_ka * (loading.rating / loading.duty - 1));
    standing.rules[r].merge(std::move(one));
  }
  if (through.fault->c37 == nullptr || through.interrupting_ka < standing.finding_ka) return;
  if (through.interrupting_ka == standing.finding_ka && state >= standing.finding_state) return;
  standing.finding = detail::simplified_finding(*judged.device, through);
  standing.finding_ka = through.interrupting_ka;
  standing.finding_state = state;
}

int badness(Verdict verdict) {
  switch (verdict) {
    case Verdict::over:
      return 3;
    case Verdict::not_evaluated:
      return 2;
    case Verdict::marginal:
      return 1;
    case Verdict::within:
      return 0;
  }
  return 0;
}

void Duty::conclude(Standings& standings) {
  for (std::size_t d = 0; d < judged_.size(); ++d) {
    const Judged& judged = judged_[d];
    DeviceStanding& standing = standings[d];
    DeviceDuty duty{judged.ref, {}, Verdict::within, {}, {}, {}, {}};
    double most = -1;
    for (std::size_t r = 0; r < judged.rules.size(); ++r) {
      Standing& s = standing.rules[r];
      DutyCheck check = std::move(s.check);
      check.quantity = judged.rules[r].quantity;
      if (!judged.rules[r].evaluate) {
        check.verdict = Verdict::not_evaluated;
        check.why = "missing: " + judged.rules[r].missing;
      } else if (s.loading < 0 && s.blocked.empty()) {
        check.verdict = Verdict::not_evaluated;
        check.why = "no current through it in any state";
      } else if (!check.why.empty()) {
        check.verdict = Verdict::not_evaluated;
      } else if (check.has_duty() && check.margin() < 0) {
        check.verdict = Verdict::over;
      } else if (!s.blocked.empty()) {
        check.verdict = Verdict::not_evaluated;
        check.why = s.blocked;
      } else {
        check.verdict = check.margin() < options_.marginal ? Verdict::marginal : Verdict::within;
      }
      if (s.loading > most) {
        most = s.loading;
        duty.governing = r;
      }
      if (badness(check.verdict) > badness(duty.verdict)) duty.verdict = check.verdict;
      duty.checks.push_back(std::move(check));
    }
    for (const DutyCheck& c : duty.checks)  // also where more source at the bus is not what made it so
      if (c.verdict == Verdict::over && c.quantity != DutyQuantity::dc_component)
        standing.headroom_ka = std::min(standing.headroom_ka, c.through_ka * (c.rating / c.duty - 1));
    if (std::isfinite(standing.headroom_ka))
      duty.headroom_mva = std::sqrt(3.0) * network_.bus(judged.device->bus).nominal_kv * standing.headroom_ka;
    if (!standing.finding.empty()) duty.findings.push_back(std::move(standing.finding));
    ++table_.count[static_cast<std::size_t>(duty.verdict)];
    table_.devices.push_back(std::move(duty));
  }
  const auto loading = [](const DeviceDuty& d) {
    return d.governing ? 1 - d.checks[*d.governing].margin() : -1;
  };
  std::stable_sort(table_.devices.begin(), table_.devices.end(), [&](const auto& a, const auto& b) {
    return std::tuple(badness(a.verdict), loading(a)) > std::tuple(badness(b.verdict), loading(b));
  });
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
    const Study study(in_state(table_.states[state]), study_options(family, table_.states[state], threads));
    std::vector<std::optional<detail::FeedFinder>> finders(static_cast<std::size_t>(threads));
    constexpr std::size_t kInTask = 16;
    const auto tasks = static_cast<int>((last - first + kInTask - 1) / kInTask);
    sparse::run_tasks(tasks, threads, [&, from = first, to = last](int task, int thread) {
      auto& finder = finders[static_cast<std::size_t>(thread)];
      if (!finder) finder.emplace(study);
      const std::size_t start = from + static_cast<std::size_t>(task) * kInTask;
      for (std::size_t i = start; i < std::min(to, start + kInTask); ++i) {
        DeviceDuty& d = table_.devices[std::get<2>(wanted[i])];
        const Device& data = device(network_, d.device);
        const DutyCheck& check = d.checks[*d.governing];
        const auto split = [&](detail::FeedFinder& in) {
          d.feeds = in.split(data.bus, data.branch, check.side, check.through_ka, kFeeds);
        };
        if (const auto inside = study.inside_unit(data.bus)) {
          detail::FeedFinder own(*inside);
          split(own);
        } else {
          split(*finder);
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

const Device& device(const Network& network, ElementRef ref) {
  if (ref.kind == ElementKind::fuse) return network.fuses[ref.index];
  if (ref.kind == ElementKind::switchboard) return network.switchboards[ref.index];
  return network.breakers[ref.index];
}

std::string state_name(const Network& network, const DutyState& state) {
  std::string name = state.scenario ? network.scenarios[*state.scenario].id : "as written";
  if (!state.outage) return name;
  return (state.scenario ? name + " with " : "") + element(network, *state.outage).id +
         (state.outage->kind == ElementKind::bus_switch ? " open" : " out");
}

const char* verdict_name(Verdict verdict) {
  static constexpr const char* kNames[] = {"within", "marginal", "over", "not evaluated"};
  return kNames[static_cast<std::size_t>(verdict)];
}
const char* quantity_name(DutyQuantity quantity) {
  static constexpr const char* kNames[] = {"breaking",         "total breaking", "dc component",
                                           "service breaking", "making peak",    "close and latch",
                                           "short time",       "peak withstand"};
  return kNames[static_cast<std::size_t>(quantity)];
}
const char* side_name(DutySide side) {
  static constexpr const char* kNames[] = {"bus total", "fault beyond the device", "fault at the bus"};
  return kNames[static_cast<std::size_t>(side)];
}

}  // namespace kiloamp
