// Entries of Z = A^-1 on the pattern of A from L and D, without forming Z.
#pragma once
#include <array>
#include <vector>

#include "engine/sparse/elimination.hpp"

namespace kiloamp::sparse {

/// Inverse entries at the places of the pattern: diagonal[i] = Z_ii, off_diagonal[e] = Z at edges[e].
template <typename Scalar, int Lanes>
struct InverseOnPattern {
  std::vector<std::array<Scalar, Lanes>> diagonal;
  std::vector<std::array<Scalar, Lanes>> off_diagonal;
};

/// Memory of one inversion at a time. Keep it: its first touch costs as much as the inversion.
template <typename Scalar, int Width>
struct InverseWorkspace {
  struct Worker {
    std::vector<Pack<Scalar, 4>> stack;
    std::vector<Pack<Scalar, 4>> scratch;
  };
  LineArray<Pack<Scalar, Width>> slots;  // as those of the factors, of Z
  std::vector<Pack<Scalar, 4>> kept;
  std::vector<Worker> workers;
};

/// Fills `inverse` (resized to the pattern). From the root down, with S the rows of column j:
///   Z_jS = -Z_SS L_Sj,   Z_jj = 1 / d_j - L_Sj^T Z_Sj.
/// Z_SS is known when column j is reached because the rows of S are joined pairwise in L.
///
/// Source: Takahashi, Fagan, Chen, "Formation of a sparse bus impedance matrix and its application to short
/// circuit
///         study", PICA 1973; Erisman, Tinney, Comm. ACM 18 (1975) 177-179; both from memory.
template <typename Scalar, int Lanes>
void invert_on_pattern(const LaneFactors<Scalar, padded_width(Lanes)>& factors,
                       InverseWorkspace<Scalar, padded_width(Lanes)>& workspace,
                       InverseOnPattern<Scalar, Lanes>& inverse, int threads);

}  // namespace kiloamp::sparse
