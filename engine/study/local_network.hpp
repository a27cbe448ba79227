// A few buses of a solved network with all impedances between them: small enough to change at will.
#pragma once
#include <Eigen/Core>
#include <span>

#include "engine/study/outage_change.hpp"
#include "engine/study/study.hpp"

namespace kiloamp::detail {

/// Z between the nodes of some buses, per sequence, in pu; and the changes that stay within them. Every
/// method costs the size of the small matrices only.
class LocalNetwork {
 public:
  using Matrix = Eigen::MatrixXcd;
  /// Blocks of columns of Z, one thread's memory.
  using Solver = sparse::Factorisation<Complex, 3>::SparseSolver;

  /// @param nodes   distinct; everything that will be changed or read
  /// @param solver  of the solved network
  LocalNetwork(const std::vector<Node>& nodes, Solver& solver);

  [[nodiscard]] bool has(Node node) const { return find(node) >= 0; }
  [[nodiscard]] Complex z(Node i, Node j, int sequence) const;
  [[nodiscard]] BySequence<Complex> z_all(Node i, Node j) const {
    return {z(i, j, 0), z(i, j, 1), z(i, j, 2)};
  }

  /// Z' = Z + (Z U)(D^-1 - U^T Z U)^-1 (Z U)^T. Where a sequence's small matrix is singular, a part is cut
  /// off: what remains keeps its Z when the change has rank 1 (nothing flowed there).
  /// @return per sequence whether the small matrix is near singular, so that the graph is to be asked what
  /// was lost;
  ///         empty: singular and of a higher rank, the network must not be used any more
  [[nodiscard]] std::optional<BySequence<bool>> apply(const OutageChange& change);

  /// A terminal taken off its node, its end open: [Y c; c^T y][V; delta] = [I; I_end], c the terminal's
  /// column of its blocks, w = Z c, s = y - c^T w. An injection at the end gives V = Z_n - w delta and V_end
  /// = V_n + delta with delta = (1 - w_n) / s; at another node j, delta = -w_j / s. Where s is 0 the line was
  /// the only way between two parts of which one has no path to earth: w_n = 1 says that it is the part left
  /// behind, and the end keeps the node's Z (nothing flowed there); w_n = 0 that it is the end's own.
  struct OpenEnd {
    Node node = Node::none;              ///< that the terminal left
    BySequence<std::vector<Complex>> w;  ///< by local place
    BySequence<Complex> s{};
    BySequence<bool> bridge{};  ///< s is 0
    /// The end still has a path in that sequence.
    [[nodiscard]] bool has_path(int sequence, std::size_t place_of_node) const {
      return !bridge[sequence] || std::abs(w[sequence][place_of_node] - 1.0) < 0.5;
    }
  };
  /// A terminal and its admittance in another's row.
  struct Entry {
    std::uint32_t terminal;
    BySequence<Complex> y;
  };
  [[nodiscard]] OpenEnd open(const SequenceModel& model, std::uint32_t terminal,
                             std::span<const Entry> row) const;
  [[nodiscard]] bool has_path(const OpenEnd& end, int sequence) const {
    return end.has_path(sequence, static_cast<std::size_t>(place(end.node)));
  }
  /// Z between a local node and the open end, and of the end itself; in sequences where the end has a path.
  [[nodiscard]] BySequence<Complex> z_to_end(Node i, const OpenEnd& end) const;
  [[nodiscard]] BySequence<Complex> z_of_end(const OpenEnd& end) const;

 private:
  [[nodiscard]] Eigen::Index find(Node node) const;
  [[nodiscard]] Eigen::Index place(Node node) const;

  std::vector<std::pair<Node, Eigen::Index>> places_;  ///< sorted by node
  BySequence<Matrix> z_;
};

}  // namespace kiloamp::detail
