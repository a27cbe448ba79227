#include "engine/fault/companion_networks.hpp"

#include <cassert>
#include <cmath>
#include <numeric>

#include "engine/fault/fault_network.hpp"
#include "engine/sparse/run_tasks.hpp"

namespace kiloamp {

using detail::FaultNetwork;

CompanionNetworks::CompanionNetworks(const FaultSolver& solved, std::span<const SequenceModel> models,
                                     int threads)
    : model_(&solved.model()) {
  assert(!models.empty() && models.size() <= kMost);
  const FaultNetwork& network = solved.solved();
  auto values = network.empty_values();
  for (std::size_t m = 0; m < kMost; ++m) {
    const SequenceModel& model =
        models[std::min(m, models.size() - 1)];  // a lane without a model repeats the last
    assert(model.node_count() == model_->node_count());
    network.put_positive(model, static_cast<int>(m), values);
    has_source_[m] = model.has_source;
  }
  const sparse::Factorisation<Complex, 3> factors(network.analysis(), values, threads);
  z_pu_ = std::move(factors.selected_inverse(threads).diagonal);
}

std::optional<Complex> CompanionNetworks::impedance_pu(std::size_t which, BusIndex bus) const {
  const Node node = model_->node_of_bus[at(bus)];
  if (node == Node::none || !has_source_[which][at(node)]) return std::nullopt;
  return z_pu_[at(node)][which];
}

NearSources::NearSources(const FaultSolver& solved, std::span<const SourcePlace> sources,
                         std::span<const double> e_pu, int threads) {
  const FaultNetwork& network = solved.solved();
  const auto& factors = network.factors();
  const std::size_t nodes = solved.model().node_count();
  const auto& accuracy = factors.accuracy()[kPositive];
  const bool plain = !accuracy.refined && !accuracy.pivoting;
  std::vector<double> floor(nodes);
  for (std::size_t k = 0; k < nodes; ++k)
    floor[k] = std::abs(network.inverse().diagonal[k][kPositive]) / e_pu[k];

  struct Hit {
    Node node;
    Near near;
  };
  constexpr std::size_t kInTask = 64;
  const std::size_t tasks = (sources.size() + kInTask - 1) / kInTask;
  std::vector<std::vector<Hit>> hits(tasks);
  std::vector<std::optional<sparse::LargeEntries<Complex, 3>>> finders(
      static_cast<std::size_t>(std::max(1, threads)));
  sparse::run_tasks(static_cast<int>(tasks), threads, [&](int task, int thread) {
    auto& finder = finders[static_cast<std::size_t>(thread)];
    if (!finder && plain) finder.emplace(factors.plain_factors(), kPositive, floor);
    auto& found = hits[static_cast<std::size_t>(task)];
    std::vector<sparse::Factorisation<Complex, 3>::Entry> column(plain ? 0 : nodes);
    const std::size_t first = static_cast<std::size_t>(task) * kInTask;
    for (std::size_t s = first; s < std::min(sources.size(), first + kInTask); ++s) {
      const auto take = [&](sparse::Index row, Complex z) {
        found.push_back({static_cast<Node>(row), {static_cast<std::uint32_t>(s), z}});
      };
      const auto row = static_cast<sparse::Index>(sources[s].node);
      if (plain) {
        finder->column(row, sources[s].least, take);
        continue;
      }
      factors.column(row, column);
      for (std::size_t k = 0; k < nodes; ++k)
        if (std::abs(column[k][kPositive]) > sources[s].least * floor[k])
          take(static_cast<sparse::Index>(k), column[k][kPositive]);
    }
  });
  start_.assign(nodes + 1, 0);
  for (const auto& found : hits)
    for (const Hit& hit : found) ++start_[at(hit.node) + 1];
  std::partial_sum(start_.begin(), start_.end(), start_.begin());
  near_.resize(start_.back());
  std::vector<std::size_t> next(start_.begin(), start_.end() - 1);
  for (const auto& found : hits)
    for (const Hit& hit : found) near_[next[at(hit.node)]++] = hit.near;
}

std::vector<double> weighted_transfer_pu(const FaultSolver& solved,
                                         std::span<const std::pair<Node, double>> sources) {
  auto solver = solved.solved().factors().sparse_solver();
  std::vector<double> sum(solved.model().node_count(), 0);
  constexpr std::size_t kBlock = sparse::Factorisation<Complex, 3>::SparseSolver::kBlock;
  for (std::size_t first = 0; first < sources.size(); first += kBlock) {
    const std::size_t count = std::min(kBlock, sources.size() - first);
    solver.clear();
    for (std::size_t k = 0; k < count; ++k)
      solver.put(static_cast<int>(k), static_cast<sparse::Index>(sources[first + k].first),
                 {0, sources[first + k].second, 0});
    solver.solve();
    for (std::size_t n = 0; n < sum.size(); ++n)
      for (std::size_t k = 0; k < count; ++k)
        sum[n] += std::abs(solver.get(static_cast<int>(k), static_cast<sparse::Index>(n))[kPositive]);
  }
  return sum;
}

}  // namespace kiloamp
