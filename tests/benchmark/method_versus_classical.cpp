// What IEC 60909-0 costs on a case, companion networks and machine currents included, against the classical
// sweep.
//
// usage: method_versus_classical CASE.json [THREADS]      default 2 threads
// Each round builds the model, solves it and evaluates four faults at every bus; medians of five.
#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <vector>

#include "engine/study/ordered_pieces.hpp"
#include "engine/study/study.hpp"
#include "io/case_file/case_reader.hpp"

namespace {

using namespace kiloamp;

double round_ms(Network network, Method method, int threads) {
  StudyOptions options;
  options.method = method;
  options.threads = threads;
  const auto start = std::chrono::steady_clock::now();
  const Study study(std::move(network), options);
  std::vector<FaultLoop> loops;
  std::vector<double> sums(static_cast<std::size_t>(threads), 0);
  for (int t = 0; t < threads; ++t) loops.emplace_back(study);
  const auto& buses = study.wanted_buses();
  in_ordered_pieces(
      buses.size(), 256, threads,
      [&](int t, std::size_t first, std::size_t last) {
        const auto own = static_cast<std::size_t>(t);
        for (std::size_t b = first; b < last; ++b)
          loops[own].at_bus(buses[b],
                            [&](const StudiedFault& fault) { sums[own] += fault.result.current_ka; });
      },
      [](int) {});
  return std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - start).count();
}

double median(std::vector<double> times) {
  std::sort(times.begin(), times.end());
  return times[times.size() / 2];
}

}  // namespace

int main(int argc, char** argv) {
  if (argc < 2) {
    std::fprintf(stderr, "usage: method_versus_classical CASE.json [THREADS]\n");
    return 2;
  }
  const int threads = argc > 2 ? std::atoi(argv[2]) : 2;
  const ReadResult read = read_case(argv[1]);
  if (!read.network) {
    std::fputs(render(read.errors).c_str(), stderr);
    return 2;
  }
  std::vector<double> classical, iec;
  for (int round = 0; round < 5; ++round) {
    classical.push_back(round_ms(Network(*read.network), Method::classical, threads));
    iec.push_back(round_ms(Network(*read.network), Method::iec60909, threads));
  }
  std::printf(
      "%zu buses, %zu machines and motors, %d threads: classical %.0f ms, IEC 60909-0 %.0f ms: %.1f times\n",
      read.network->buses.size(),
      read.network->synchronous_machines.size() + read.network->induction_motors.size(), threads,
      median(classical), median(iec), median(iec) / median(classical));
  return 0;
}
