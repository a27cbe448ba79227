// Time of each step of engine/sparse on synthetic network matrices.
#include <benchmark/benchmark.h>

#include <map>

#include "tests/benchmark/network_matrix.hpp"

namespace {

using namespace kiloamp::sparse;
using Complex = std::complex<double>;

constexpr unsigned kSeed = 1;

struct Case {
  synthetic::NetworkMatrix network;
  Values<Complex, 1> positive;
  std::shared_ptr<const Analysis> analysis;
};

const Case& network_of(std::int64_t order) {
  static std::map<std::int64_t, Case> cases;
  const auto found = cases.find(order);
  if (found != cases.end()) return found->second;
  Case one{synthetic::network_matrix(static_cast<Index>(order), kSeed), {}, nullptr};
  one.positive = synthetic::lane(one.network, 0);
  one.analysis = std::make_shared<const Analysis>(one.network.order, one.network.edges);
  return cases.emplace(order, std::move(one)).first->second;
}

void analysis(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  for (auto _ : state)
    benchmark::DoNotOptimize(Analysis(one.network.order, one.network.edges).factor_entries());
}

template <int Lanes>
const Values<Complex, Lanes>& values_of(const Case& one) {
  if constexpr (Lanes == 1) {
    return one.positive;
  } else {
    return one.network.values;
  }
}

template <int Lanes>
void refactorise(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  Factorisation<Complex, Lanes> factorisation(one.analysis, values_of<Lanes>(one));
  for (auto _ : state) factorisation.refactorise(values_of<Lanes>(one), static_cast<int>(state.range(1)));
}

template <int Lanes>
void selected_inverse(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  const Factorisation<Complex, Lanes> factorisation(one.analysis, values_of<Lanes>(one));
  typename Factorisation<Complex, Lanes>::SelectedInverse inverse;
  for (auto _ : state) factorisation.selected_inverse(inverse, static_cast<int>(state.range(1)));
}

template <int Lanes>
void four_columns(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  const Factorisation<Complex, Lanes> factorisation(one.analysis, values_of<Lanes>(one));
  auto solver = factorisation.sparse_solver();
  std::array<Complex, Lanes> unit;
  unit.fill(1.0);
  Index row = 0;
  for (auto _ : state) {
    solver.clear();
    for (int c = 0; c < 4; ++c) solver.put(c, row = (row + 7919) % one.network.order, unit);
    solver.solve();
  }
}

template <int Lanes>
void single_entry(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  const Factorisation<Complex, Lanes> factorisation(one.analysis, values_of<Lanes>(one));
  Index row = 0;
  for (auto _ : state) {
    row = (row + 7919) % one.network.order;
    benchmark::DoNotOptimize(factorisation.inverse_entry(row, one.network.order - 1 - row));
  }
}

/// All Z'_kk of all lanes after the removal of one branch.
void change_of_rank_one(benchmark::State& state) {
  const Case& one = network_of(state.range(0));
  const Factorisation<Complex, 3> factorisation(one.analysis, one.network.values);
  const auto before = factorisation.selected_inverse().diagonal;
  auto after = before;
  std::size_t e = 0;
  for (auto _ : state) {
    e = (e + 104729) % one.network.edges.size();
    const Edge& edge = one.network.edges[e];
    const std::vector<SparseVector<Complex, 3>> u{{{edge.i, {1, 1, 1}}, {edge.j, {-1, -1, -1}}}};
    const std::vector<std::array<Complex, 3>> d{one.network.values.off_diagonal[e]};
    after = before;
    LowRankChange<Complex, 3>(factorisation, u, d).change_diagonal(after);
    benchmark::DoNotOptimize(after.data());
  }
}

void sizes(benchmark::internal::Benchmark* one) {
  for (const int order : {1000, 10000, 100000}) one->Arg(order);
  one->Unit(benchmark::kMillisecond);
}

void sizes_and_threads(benchmark::internal::Benchmark* one) {
  for (const int order : {1000, 10000, 100000}) {
    for (const int threads : {1, 2}) one->Args({order, threads});
  }
  one->Unit(benchmark::kMillisecond)->UseRealTime();
}

BENCHMARK(analysis)->Apply(sizes);
BENCHMARK(refactorise<1>)->Apply(sizes_and_threads);
BENCHMARK(refactorise<3>)->Apply(sizes_and_threads);
BENCHMARK(selected_inverse<1>)->Apply(sizes_and_threads);
BENCHMARK(selected_inverse<3>)->Apply(sizes_and_threads);
BENCHMARK(four_columns<1>)->Apply(sizes);
BENCHMARK(four_columns<3>)->Apply(sizes);
BENCHMARK(single_entry<3>)->Apply(sizes);
BENCHMARK(change_of_rank_one)->Apply(sizes);

}  // namespace

BENCHMARK_MAIN();
