#include "engine/study/local_network.hpp"

#include <Eigen/LU>
#include <Eigen/SVD>
#include <algorithm>
#include <cassert>
#include <limits>

namespace kiloamp::detail {

namespace {

// A small matrix that has shrunk to this part of its own terms says that the change cuts something off.
constexpr double kSingular = 1e-12, kSuspect = 1e-6;
// The same of a terminal taken off, against the admittances of its branch.
constexpr double kBridge = 1e-11;

}  // namespace

LocalNetwork::LocalNetwork(const std::vector<Node>& nodes, Solver& solver) {
  const auto count = static_cast<Eigen::Index>(nodes.size());
  for (auto& z : z_) z.resize(count, count);
  std::vector<sparse::Index> rows;
  for (Eigen::Index i = 0; i < count; ++i) {
    places_.emplace_back(nodes[static_cast<std::size_t>(i)], i);
    rows.push_back(static_cast<sparse::Index>(nodes[static_cast<std::size_t>(i)]));
  }
  std::sort(places_.begin(), places_.end());
  constexpr Eigen::Index kBlock = Solver::kBlock;
  for (Eigen::Index first = 0; first < count; first += kBlock) {
    const Eigen::Index some = std::min(kBlock, count - first);
    solver.clear();
    for (Eigen::Index c = 0; c < some; ++c)
      solver.put(static_cast<int>(c), rows[static_cast<std::size_t>(first + c)], {1, 1, 1});
    solver.solve_at(rows);
    for (Eigen::Index c = 0; c < some; ++c)
      for (Eigen::Index i = 0; i < count; ++i) {
        const auto entry = solver.get(static_cast<int>(c), rows[static_cast<std::size_t>(i)]);
        for (int s = 0; s < 3; ++s) z_[s](i, first + c) = entry[static_cast<std::size_t>(s)];
      }
  }
}

Eigen::Index LocalNetwork::find(Node node) const {
  const auto found = std::lower_bound(places_.begin(), places_.end(), std::pair(node, Eigen::Index{0}));
  return found != places_.end() && found->first == node ? found->second : -1;
}
Eigen::Index LocalNetwork::place(Node node) const {
  const Eigen::Index found = find(node);
  assert(found >= 0);
  return found;
}

Complex LocalNetwork::z(Node i, Node j, int sequence) const { return z_[sequence](place(i), place(j)); }

std::optional<BySequence<bool>> LocalNetwork::apply(const OutageChange& o) {
  BySequence<bool> suspect{};
  for (int s = 0; s < 3; ++s) {
    const int rank = o.rank[s];
    if (rank == 0) continue;
    Matrix& z = z_[s];
    Matrix w = Matrix::Zero(z.rows(), rank), k = Matrix::Zero(rank, rank);
    double smallest = std::numeric_limits<double>::infinity();
    for (int r = 0; r < rank; ++r) {
      const auto& u = o.u[s][static_cast<std::size_t>(r)];
      for (std::size_t p = 0; p < o.nodes.size(); ++p)
        if (u[p] != Complex(0)) w.col(r) += u[p] * z.col(place(o.nodes[p]));
      k(r, r) = 1.0 / o.d[s][static_cast<std::size_t>(r)];
      smallest = std::min(smallest, std::abs(k(r, r)));
    }
    for (int a = 0; a < rank; ++a)
      for (int b = 0; b < rank; ++b)
        for (std::size_t p = 0; p < o.nodes.size(); ++p)
          k(a, b) -= o.u[s][static_cast<std::size_t>(a)][p] * w(place(o.nodes[p]), b);
    const double least =
        rank == 1 ? std::abs(k(0, 0)) : Eigen::JacobiSVD<Matrix>(k).singularValues()(rank - 1);
    suspect[s] = least <= kSuspect * smallest;
    if (rank > 1 && suspect[s]) return std::nullopt;
    if (least > kSingular * smallest) z += w * k.inverse() * w.transpose();
  }
  return suspect;
}

LocalNetwork::OpenEnd LocalNetwork::open(const SequenceModel& m, std::uint32_t terminal,
                                         std::span<const Entry> row) const {
  OpenEnd end;
  end.node = m.terminals[terminal].node;
  for (int s = 0; s < 3; ++s) {
    Eigen::VectorXcd c = Eigen::VectorXcd::Zero(z_[s].rows());
    Complex own = 0;
    double size = 0;
    for (const Entry& entry : row) {
      c(place(m.terminals[entry.terminal].node)) += entry.y[s];
      if (entry.terminal == terminal) own += entry.y[s];
      size = std::max(size, std::abs(entry.y[s]));
    }
    const Eigen::VectorXcd w = z_[s] * c;
    end.w[s].assign(w.data(), w.data() + w.size());
    end.s[s] = own - (c.transpose() * w)(0);
    end.bridge[s] = std::abs(end.s[s]) <= kBridge * size;
  }
  return end;
}

BySequence<Complex> LocalNetwork::z_to_end(Node i, const OpenEnd& end) const {
  BySequence<Complex> z{};
  const auto at_i = static_cast<std::size_t>(place(i)), at_n = static_cast<std::size_t>(place(end.node));
  for (int s = 0; s < 3; ++s) {
    z[s] = this->z(i, end.node, s);
    if (!end.bridge[s]) z[s] -= end.w[s][at_i] * (1.0 - end.w[s][at_n]) / end.s[s];
  }
  return z;
}

BySequence<Complex> LocalNetwork::z_of_end(const OpenEnd& end) const {
  BySequence<Complex> z{};
  const auto at_n = static_cast<std::size_t>(place(end.node));
  for (int s = 0; s < 3; ++s) {
    const Complex step = 1.0 - end.w[s][at_n];
    z[s] = this->z(end.node, end.node, s);
    if (!end.bridge[s]) z[s] += step * step / end.s[s];
  }
  return z;
}

}  // namespace kiloamp::detail
