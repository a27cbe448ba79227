#include "engine/fault/separate_networks.hpp"

#include "engine/fault/fault_network.hpp"

namespace kiloamp {

std::optional<double> SeparateImpedance::x_over_r(FaultKind kind) const {
  double x = x1, r = r1;
  if (kind == FaultKind::line_to_ground) {
    if (!x0) return std::nullopt;
    x = 2 * x1 + *x0;
    r = 2 * r1 + *r0;
  } else if (kind == FaultKind::double_line_to_ground && x0) {
    x = x1 + x1 * *x0 / (x1 + *x0);
    r = r1 + r1 * *r0 / (r1 + *r0);
  }
  if (!(x > 0) || !(r > 0)) return std::nullopt;
  return x / r;
}

SeparateNetworks::SeparateNetworks(const FaultSolver& solved, int threads) : model_(&solved.model()) {
  const detail::FaultNetwork& network = solved.solved();
  const sparse::Factorisation<double, 4> factors(network.analysis(), network.separate_values(), threads);
  z_pu_ = factors.selected_inverse(threads).diagonal;
}

std::optional<SeparateImpedance> SeparateNetworks::at_bus(BusIndex bus) const {
  const Node node = model_->node_of_bus[at(bus)];
  if (node == Node::none || !model_->has_source[at(node)]) return std::nullopt;
  const auto& z = z_pu_[at(node)];
  SeparateImpedance one{z[0], z[2], std::nullopt, std::nullopt};
  if (model_->has_zero_path[at(node)]) {
    one.x0 = z[1];
    one.r0 = z[3];
  }
  return one;
}

}  // namespace kiloamp
