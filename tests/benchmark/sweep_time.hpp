// Wall time of a sweep without a report: what other studies are compared with.
#pragma once
#include <chrono>
#include <vector>

#include "engine/study/ordered_pieces.hpp"
#include "engine/study/study.hpp"

namespace kiloamp {

/// Model, solution and four faults at every bus by one method, in ms.
inline double sweep_ms(Network network, Method method, int threads) {
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

}  // namespace kiloamp
