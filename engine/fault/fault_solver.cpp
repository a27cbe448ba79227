#include "engine/fault/fault_solver.hpp"

#include <algorithm>
#include <cmath>

#include "engine/fault/fault_network.hpp"

namespace kiloamp {

using detail::FaultNetwork;

struct FaultSolver::Body {
  Body(const SequenceModel& model, std::vector<Prefault> given, int threads, const FaultNetwork* like)
      : network(model, threads, like), prefault(std::move(given)) {}
  FaultNetwork network;
  std::vector<Prefault> prefault;
};

class FaultSolver::Workspace {
 public:
  std::optional<BusIndex> bus;
  int depth = -1;
  TheveninData z;
  bool has_source = false;
  detail::Reach reach;
};

void FaultSolver::WorkspaceDelete::operator()(Workspace* w) const { delete w; }

FaultSolver::FaultSolver(const SequenceModel& model, std::vector<Prefault> prefault_of_bus, int threads,
                         const FaultSolver* like)
    : model_(&model),
      body_(std::make_unique<Body>(model, std::move(prefault_of_bus), threads,
                                   like != nullptr ? &like->solved() : nullptr)) {}
FaultSolver::~FaultSolver() = default;

const SolutionQuality& FaultSolver::quality() const { return body_->network.quality(); }
FaultSolver::WorkspacePtr FaultSolver::make_workspace() const { return WorkspacePtr(new Workspace); }

std::optional<TheveninData> FaultSolver::thevenin_pu(BusIndex bus) const {
  const Node node = model_->node_of_bus[at(bus)];
  if (node == Node::none || !model_->has_source[at(node)]) return std::nullopt;
  const auto& z = body_->network.inverse().diagonal[at(node)];
  TheveninData data{z[kPositive], z[kNegative], std::nullopt};
  if (model_->has_zero_path[at(node)]) data.z0 = z[kZero];
  return data;
}

namespace {

constexpr double kPi = 3.14159265358979323846;

std::optional<double> peak_ka(double current_ka, Complex loop) {
  if (current_ka == 0) return 0.0;
  if (!(loop.imag() > 0) || loop.real() < 0) return std::nullopt;
  const double kappa = 1.02 + 0.98 * std::exp(-3 * loop.real() / loop.imag());
  return kappa * std::sqrt(2.0) * current_ka;
}

BySequence<Complex> times(const BySequence<Complex>& a, const BySequence<Complex>& b, double scale) {
  return {a[0] * b[0] * scale, a[1] * b[1] * scale, a[2] * b[2] * scale};
}

}  // namespace

const detail::FaultNetwork& FaultSolver::solved() const { return body_->network; }
double FaultSolver::prefault_pu(BusIndex bus) const { return body_->prefault[at(bus)].pu; }

Complex FaultSolver::prefault_kv(BusIndex bus, BusIndex reference) const {
  const Prefault &here = body_->prefault[at(bus)], &there = body_->prefault[at(reference)];
  const int lag = model_->lag_clock[at(bus)] - model_->lag_clock[at(reference)];
  const double angle = here.deg && there.deg ? (*here.deg - *there.deg) * kPi / 180 : -kPi / 6 * lag;
  return std::polar(here.pu * model_->nominal_kv[at(bus)] / std::sqrt(3.0), angle);
}

void FaultSolver::solve(const Fault& fault, const FaultOptions& options, Workspace& workspace,
                        FaultResult& result) const {
  result.contributions.clear();
  result.branch_currents.clear();
  result.voltages.clear();
  result.neutrals.clear();
  result.fault = fault;
  const SequenceModel& model = *model_;
  const double e_pu = body_->prefault[at(fault.bus)].pu;
  const double base_kv = model.nominal_kv[at(fault.bus)] / std::sqrt(3.0);
  const double base_ohm = model.base_ohm(fault.bus);
  if (workspace.bus != fault.bus || workspace.depth != options.depth) {
    const auto z = thevenin_pu(fault.bus);
    workspace.bus = fault.bus;
    workspace.depth = options.depth;
    workspace.has_source = z.has_value();
    workspace.z = z.value_or(TheveninData{});
    if (z) body_->network.reach(fault.bus, options.depth, workspace.reach);
  }
  result.has_source = workspace.has_source;
  result.z1_ohm = result.z2_ohm = result.z0_ohm = std::nullopt;
  result.x_over_r = result.peak_ka = std::nullopt;
  result.sequence_ka = {};
  result.current_ka = 0;
  result.earth_current_ka = 0;
  result.prefault_kv = workspace.has_source ? e_pu * base_kv : 0;
  if (!workspace.has_source) {
    result.peak_ka = 0.0;
    return;
  }

  const TheveninData& z = workspace.z;
  const SequenceFault solved =
      connect_sequences(fault.kind, z, e_pu, fault.phase_ohm / base_ohm, fault.earth_ohm / base_ohm);
  const auto& i_pu = solved.current;
  for (int s = 0; s < 3; ++s) {
    if (!std::isfinite(std::abs(i_pu[s])))
      throw sparse::NumericalError("the sequence impedances cancel each other (resonance)",
                                   static_cast<sparse::Index>(model.node_of_bus[at(fault.bus)]), s);
    result.sequence_ka[s] = i_pu[s] * model.base_ka(fault.bus);
  }
  result.current_ka = largest_phase(result.sequence_ka);
  result.earth_current_ka = 3.0 * result.sequence_ka[kZero];
  if (solved.loop.real() != 0) result.x_over_r = solved.loop.imag() / solved.loop.real();
  result.peak_ka = peak_ka(result.current_ka, solved.loop);
  result.z1_ohm = z.z1 * base_ohm;
  result.z2_ohm = z.z2 * base_ohm;
  if (z.z0) result.z0_ohm = *z.z0 * base_ohm;

  const int own_lag = model.lag_clock[at(fault.bus)];
  for (const detail::CurrentShare& share : workspace.reach.currents) {
    const auto current = times(share.per_fault_current, i_pu, model.base_ka(share.bus));
    if (share.into_faulted_bus)
      result.contributions.push_back({share.element, share.bus, current});
    else
      result.branch_currents.push_back(
          {share.element, share.bus, turned(current, model.lag_clock[at(share.bus)] - own_lag)});
  }
  Complex shift_pu = 0;
  const bool earth_fault =
      fault.kind == FaultKind::line_to_ground || fault.kind == FaultKind::double_line_to_ground;
  if (earth_fault && !z.z0)
    shift_pu = earth_fault_shift_pu(fault.kind, z, e_pu, i_pu, fault.phase_ohm / base_ohm);
  for (const detail::VoltageShare& share : workspace.reach.voltages) {
    const int lag = model.lag_clock[at(share.bus)] - own_lag;
    const double kv = model.nominal_kv[at(share.bus)] / std::sqrt(3.0);
    BySequence<Complex> v = turned(times(share.per_fault_current, i_pu, -kv), lag);
    v[kPositive] += prefault_kv(share.bus, fault.bus);
    v[kZero] += shift_pu * share.shift_ratio * kv;
    result.voltages.push_back({share.bus, v});
  }
  for (const detail::NeutralShare& share : workspace.reach.neutrals)
    result.neutrals.push_back({share.element, share.bus, 3.0 * share.ka_per_fault_pu * i_pu[kZero]});
}

}  // namespace kiloamp
