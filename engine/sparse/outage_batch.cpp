#include "engine/sparse/outage_batch.hpp"

#include <algorithm>
#include <limits>
#include <optional>

#include "engine/sparse/run_tasks.hpp"

namespace kiloamp::sparse {
namespace {

std::size_t at(Index i) { return static_cast<std::size_t>(i); }

template <typename Scalar, int Lanes>
RankOneResponse<Scalar, Lanes> response_to(std::size_t number, const RankOneChange<Scalar, Lanes>& change,
                                           std::span<const std::array<Scalar, Lanes>> z) {
  RankOneResponse<Scalar, Lanes> response{number, z, {}, {}};
  for (std::size_t s = 0; s < at(Lanes); ++s) {
    Scalar projected = 0;
    double sizes = 0;
    for (const auto& term : change.u) {
      const Scalar part = term.value[s] * z[at(term.row)][s];
      projected += part;
      sizes += std::abs(part);
    }
    const Scalar denominator = Scalar(1) + change.d[s] * projected;
    const double roundings = 1 + std::abs(change.d[s]) * sizes;
    if (std::abs(denominator) > kSplitMargin * std::numeric_limits<double>::epsilon() * roundings) {
      response.gain[s] = change.d[s] / denominator;
      response.outcome[s] = ChangeOutcome::kSolved;
    } else {
      response.gain[s] = std::numeric_limits<double>::quiet_NaN();
      response.outcome[s] = ChangeOutcome::kSplits;
    }
  }
  return response;
}

}  // namespace

template <typename Scalar, int Lanes>
void each_rank_one_change(const Factorisation<Scalar, Lanes>& factorisation,
                          std::span<const RankOneChange<Scalar, Lanes>> changes,
                          const std::function<void(const RankOneResponse<Scalar, Lanes>&)>& visit,
                          int threads) {
  using Entry = std::array<Scalar, Lanes>;
  struct Worker {
    typename Factorisation<Scalar, Lanes>::SparseSolver solver;
    std::vector<Entry> z;
  };
  constexpr std::size_t kBlock = kWideBlock;
  const std::size_t order = at(factorisation.analysis().order());
  const std::size_t blocks = (changes.size() + kBlock - 1) / kBlock;
  std::vector<std::optional<Worker>> workers(static_cast<std::size_t>(std::max(threads, 1)));
  run_tasks(static_cast<int>(blocks), threads, [&](int block, int worker_number) {
    auto& worker = workers[static_cast<std::size_t>(worker_number)];
    if (!worker) worker.emplace(Worker{factorisation.sparse_solver(), std::vector<Entry>(kBlock * order)});
    const std::size_t from = static_cast<std::size_t>(block) * kBlock;
    const std::size_t count = std::min(kBlock, changes.size() - from);
    worker->solver.clear();
    for (std::size_t b = 0; b < count; ++b) {
      for (const auto& term : changes[from + b].u)
        worker->solver.put(static_cast<int>(b), term.row, term.value);
    }
    worker->solver.solve();
    worker->solver.copy_all(worker->z);
    for (std::size_t b = 0; b < count; ++b) {
      const auto z = std::span<const Entry>(worker->z).subspan(b * order, order);
      visit(response_to<Scalar, Lanes>(from + b, changes[from + b], z));
    }
  });
}

#define KILOAMP_INSTANTIATE(Scalar, Lanes)                                                \
  template void each_rank_one_change<Scalar, Lanes>(                                      \
      const Factorisation<Scalar, Lanes>&, std::span<const RankOneChange<Scalar, Lanes>>, \
      const std::function<void(const RankOneResponse<Scalar, Lanes>&)>&, int);
KILOAMP_INSTANTIATE(std::complex<double>, 1)
KILOAMP_INSTANTIATE(std::complex<double>, 3)
KILOAMP_INSTANTIATE(std::complex<double>, 4)
KILOAMP_INSTANTIATE(double, 1)
KILOAMP_INSTANTIATE(double, 2)
KILOAMP_INSTANTIATE(double, 4)
#undef KILOAMP_INSTANTIATE

}  // namespace kiloamp::sparse
