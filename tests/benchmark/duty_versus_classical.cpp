// What a duty study costs for each network state, against the classical sweep of the same network.
//
// usage: duty_versus_classical CASE.json [DEVICES [THREADS]]      default 5000 devices, 2 threads
// Breakers of one family are put on the first terminals of lines and transformers. The cost of a state is the
// difference between a study of five states and one of a single state, over four: it holds the three networks
// of C37 with their X and R networks (or those of IEC 60909-0), the currents through every device for four
// faults, and the rules. What is done once (sources of what governs) is printed apart. The least of nine
// rounds.
#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>

#include "engine/study/duty.hpp"
#include "io/case_file/case_reader.hpp"
#include "tests/benchmark/sweep_time.hpp"

namespace {

using namespace kiloamp;
using Clock = std::chrono::steady_clock;

Network with_devices(Network network, DeviceFamily family, std::size_t count) {
  network.breakers.clear();
  network.scenarios.clear();
  const auto add = [&](BusIndex bus, ElementKind kind, std::size_t i) {
    if (network.breakers.size() == count) return;
    Breaker b;
    b.id = "CB" + std::to_string(network.breakers.size());
    b.bus = bus;
    b.branch = ElementRef{kind, static_cast<std::uint32_t>(i)};
    b.standard = family == DeviceFamily::iec ? DeviceStandard::iec62271_100 : DeviceStandard::c37_constant_ka;
    b.rated_kv = network.bus(bus).nominal_kv;
    b.breaking_ka = b.interrupting_ka = b.short_time_ka = 40;
    b.making_peak_ka = 100;
    b.short_time_s = 3;
    b.opening_time_s = 0.045;
    b.interrupting_time_cycles = 5;
    network.breakers.push_back(b);
  };
  for (std::size_t i = 0; i < std::max(network.lines.size(), network.transformers.size()); ++i) {
    if (i < network.lines.size()) {
      add(network.lines[i].from, ElementKind::line, i);
      add(network.lines[i].to, ElementKind::line, i);
    }
    if (i < network.transformers.size()) add(network.transformers[i].lv_bus, ElementKind::transformer, i);
  }
  return network;
}

double duty_ms(const Network& network, std::size_t states, int threads) {
  Network n = network;
  for (std::size_t s = 1; s < states; ++s) {
    Scenario scenario;
    scenario.id = "S" + std::to_string(s);
    scenario.out = {ElementRef{ElementKind::line, static_cast<std::uint32_t>(17 * s)}};
    n.scenarios.push_back(scenario);
  }
  DutyOptions options;
  options.study.threads = threads;
  const auto start = Clock::now();
  const DutyTable table = duty(n, options);
  const double ms = std::chrono::duration<double, std::milli>(Clock::now() - start).count();
  if (table.states.size() != states) std::abort();
  return ms;
}

double least(const std::vector<double>& times) { return *std::min_element(times.begin(), times.end()); }

}  // namespace

int main(int argc, char** argv) {
  if (argc < 2) {
    std::fprintf(stderr, "usage: duty_versus_classical CASE.json [DEVICES [THREADS]]\n");
    return 2;
  }
  const auto count = static_cast<std::size_t>(argc > 2 ? std::atoi(argv[2]) : 5000);
  const int threads = argc > 3 ? std::atoi(argv[3]) : 2;
  ReadResult read = read_case(argv[1]);
  if (!read.network) {
    std::fputs(render(read.errors).c_str(), stderr);
    return 2;
  }
  for (SynchronousMachine& m : read.network->synchronous_machines)
    if (!m.xd_transient_percent)
      m.xd_transient_percent = 1.5 * m.xd_subtransient_percent;  // for the delayed network
  constexpr std::size_t kStates = 5;
  for (const DeviceFamily family : {DeviceFamily::ansi, DeviceFamily::iec}) {
    const Network network = with_devices(*read.network, family, count);
    std::vector<double> classical, one, five;
    for (int round = 0; round < 9; ++round) {
      classical.push_back(sweep_ms(Network(*read.network), Method::classical, threads));
      one.push_back(duty_ms(network, 1, threads));
      five.push_back(duty_ms(network, kStates, threads));
    }
    const double state = (least(five) - least(one)) / (kStates - 1), once = least(one) - state;
    std::printf(
        "%zu buses, %zu devices, %d threads, %s: classical sweep %.1f ms, each state %.1f ms: %.1f times; "
        "once %.1f ms\n",
        network.buses.size(), network.breakers.size(), threads, family == DeviceFamily::iec ? "IEC" : "C37",
        least(classical), state, state / least(classical), once);
  }
  return 0;
}
