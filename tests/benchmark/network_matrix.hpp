// Synthetic matrices with the structure of power networks, for benchmarks only.
#pragma once
#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <cstdint>
#include <random>
#include <unordered_set>
#include <vector>

#include "engine/sparse/symmetric_system.hpp"

namespace kiloamp::sparse::synthetic {

/// Three sequence matrices on one pattern.
struct NetworkMatrix {
  Index order = 0;
  std::vector<Edge> edges;
  Values<std::complex<double>, 3> values;
};

/// `order` buses and about 1.38 times as many branches.
///
/// 70 % of the buses are meshed. They form regions of about 42, each hanging from one node of an extra high
/// voltage grid that covers the plane; a region is a local tree with near ties, some ties reach the next
/// region, one bus in 500 is a hub. 30 % are radial feeders that branch off anywhere. Every branch has
/// resistance and reactance, 3 % of the buses a machine or load to earth (machines only in zero sequence,
/// with other values), all others a millionth of charging. Degrees 1/2/3/4: about 15/36/26/13 %.
class NetworkGenerator {
 public:
  NetworkGenerator(Index order, unsigned seed) : random_(seed) {
    network_.order = order;
    meshed_ = std::max<Index>(1, order * 7 / 10);
    regions_ = std::max<Index>(1, meshed_ / kRegion);
    width_ = std::max<Index>(1, static_cast<Index>(std::sqrt(static_cast<double>(regions_))));
  }

  NetworkMatrix run() {
    for (Index v = 1; v < meshed_; ++v) {
      const Index inside = v % kRegion;
      if (inside == 0 || v / kRegion >= regions_) continue;
      connect(v, v - 1 - (random_() % 10 < 7 ? 0 : below(std::min<Index>(inside, 5))));
    }
    for (Index v = regions_ * kRegion; v < meshed_; ++v) connect(v, v - 1);
    lay_overlay();
    raise_hubs();
    const auto wanted =
        static_cast<std::size_t>(1.38 * network_.order) - static_cast<std::size_t>(network_.order - meshed_);
    for (int tries = 0; network_.edges.size() < wanted && tries < 20 * network_.order; ++tries) {
      const Index v = below(meshed_);
      connect_near(v, random_() % 12 == 0 ? kRegion : 6);
    }
    for (Index v = meshed_; v < network_.order; ++v) {
      connect(v, v > meshed_ && random_() % 5 < 3 ? v - 1 : below(meshed_));
    }
    fill_values();
    return std::move(network_);
  }

 private:
  static constexpr Index kRegion = 42;

  Index below(Index limit) { return static_cast<Index>(random_() % static_cast<unsigned>(limit)); }
  double between(double low, double high) {
    return std::uniform_real_distribution<double>(low, high)(random_);
  }

  void connect(Index a, Index b) {
    if (a == b || a < 0 || b < 0) return;
    const auto key =
        static_cast<std::uint64_t>(std::min(a, b)) << 32 | static_cast<std::uint64_t>(std::max(a, b));
    if (known_.insert(key).second) network_.edges.push_back({a, b});
  }

  void connect_near(Index v, Index reach) {
    const Index other = v + 1 + below(reach);
    if (other < meshed_ && (reach == kRegion || other / kRegion == v / kRegion)) connect(v, other);
  }

  void lay_overlay() {
    for (Index r = 1; r < regions_; ++r) {
      const bool row_start = r % width_ == 0;
      const bool below_row = r >= width_;
      if (!row_start) connect(r * kRegion, (r - 1) * kRegion);
      if (below_row && (row_start || random_() % 10 < 7)) connect(r * kRegion, (r - width_) * kRegion);
    }
  }

  void raise_hubs() {
    for (Index k = 0; k < meshed_ / 500; ++k) {
      const Index hub = below(meshed_);
      for (int tie = 0; tie < 10; ++tie) connect_near(hub, 12);
    }
  }

  void fill_values() {
    using Complex = std::complex<double>;
    auto& values = network_.values;
    values.diagonal.assign(static_cast<std::size_t>(network_.order), {});
    for (const Edge& edge : network_.edges) {
      const double x = std::exp(between(std::log(0.005), std::log(0.5)));
      const Complex z1(x * between(0.05, 0.6), x);
      const Complex z0(3.1 * z1.real(), 2.7 * z1.imag());
      const std::array<Complex, 3> y{1.0 / z1, 1.0 / z1, 1.0 / z0};
      auto& entry = values.off_diagonal.emplace_back();
      for (std::size_t s = 0; s < 3; ++s) {
        entry[s] = -y[s];
        values.diagonal[static_cast<std::size_t>(edge.i)][s] += y[s];
        values.diagonal[static_cast<std::size_t>(edge.j)][s] += y[s];
      }
    }
    for (auto& entry : values.diagonal) {
      const bool shunt = random_() % 100 < 3;
      const Complex y = shunt ? 1.0 / Complex(0.02, between(0.1, 0.4)) : Complex(1e-6, 1e-4);
      const std::array<Complex, 3> earth{y, 1.1 * y, 0.6 * y};
      for (std::size_t s = 0; s < 3; ++s) entry[s] += earth[s];
    }
  }

  std::mt19937 random_;
  NetworkMatrix network_;
  Index meshed_;
  Index regions_;
  Index width_;
  std::unordered_set<std::uint64_t> known_;
};

inline NetworkMatrix network_matrix(Index order, unsigned seed) {
  return NetworkGenerator(order, seed).run();
}

/// One lane of several.
inline Values<std::complex<double>, 1> lane(const NetworkMatrix& network, std::size_t which) {
  Values<std::complex<double>, 1> one;
  for (const auto& entry : network.values.diagonal) one.diagonal.push_back({entry[which]});
  for (const auto& entry : network.values.off_diagonal) one.off_diagonal.push_back({entry[which]});
  return one;
}

}  // namespace kiloamp::sparse::synthetic
