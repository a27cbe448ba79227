// What IEC 60909-0 costs on a case, companion networks and machine currents included, against the classical
// sweep.
//
// usage: method_versus_classical CASE.json [THREADS]      default 2 threads
// Each round builds the model, solves it and evaluates four faults at every bus; medians of five.
#include <algorithm>
#include <cstdio>
#include <cstdlib>
#include <vector>

#include "io/case_file/case_reader.hpp"
#include "tests/benchmark/sweep_time.hpp"

namespace {

using namespace kiloamp;

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
    classical.push_back(sweep_ms(Network(*read.network), Method::classical, threads));
    iec.push_back(sweep_ms(Network(*read.network), Method::iec60909, threads));
  }
  std::printf(
      "%zu buses, %zu machines and motors, %d threads: classical %.0f ms, IEC 60909-0 %.0f ms: %.1f times\n",
      read.network->buses.size(),
      read.network->synchronous_machines.size() + read.network->induction_motors.size(), threads,
      median(classical), median(iec), median(iec) / median(classical));
  return 0;
}
