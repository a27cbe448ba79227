// Selected inverse against column-by-column solutions with SuiteSparse KLU and Eigen SparseLU, in one
// process.
//
// usage: versus_sparse_lu [order ...]      default 1000 10000 100000
// All times are medians of interleaved repetitions on one thread unless said otherwise. A column sweep is
// factor time plus order times the measured column time, that is, extrapolated.
#include <suitesparse/klu.h>

#include <Eigen/SparseCore>
#include <Eigen/SparseLU>
#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <functional>
#include <vector>

#include "tests/benchmark/network_matrix.hpp"

namespace {

using namespace kiloamp::sparse;
using Complex = std::complex<double>;

constexpr unsigned kSeed = 1;
constexpr int kColumns = 200;
constexpr int kWidth = 16;  // right-hand sides in one KLU block

double milliseconds(const std::function<void()>& work) {
  const auto start = std::chrono::steady_clock::now();
  work();
  return std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - start).count();
}

double median(std::vector<double> times) {
  std::nth_element(times.begin(), times.begin() + static_cast<std::ptrdiff_t>(times.size() / 2), times.end());
  return times[times.size() / 2];
}

/// KLU with complex entries, on the full unsymmetric storage that it wants.
class Klu {
 public:
  explicit Klu(const Eigen::SparseMatrix<Complex>& a)
      : order_(static_cast<int>(a.rows())),
        columns_(a.outerIndexPtr(), a.outerIndexPtr() + order_ + 1),
        rows_(a.innerIndexPtr(), a.innerIndexPtr() + a.nonZeros()) {
    for (Eigen::Index k = 0; k < a.nonZeros(); ++k) {
      values_.push_back(a.valuePtr()[k].real());
      values_.push_back(a.valuePtr()[k].imag());
    }
    klu_defaults(&common_);
    symbolic_ = klu_analyze(order_, columns_.data(), rows_.data(), &common_);
    numeric_ = klu_z_factor(columns_.data(), rows_.data(), values_.data(), symbolic_, &common_);
  }
  ~Klu() {
    klu_z_free_numeric(&numeric_, &common_);
    klu_free_symbolic(&symbolic_, &common_);
  }
  Klu(const Klu&) = delete;
  Klu& operator=(const Klu&) = delete;

  void refactor() {
    klu_z_refactor(columns_.data(), rows_.data(), values_.data(), symbolic_, numeric_, &common_);
  }

  /// Columns first, first + 1, ... of the inverse into x (count * order complex numbers).
  void columns(const std::vector<int>& which, std::vector<Complex>& x) {
    std::fill(x.begin(), x.end(), 0.0);
    for (std::size_t c = 0; c < which.size(); ++c)
      x[c * static_cast<std::size_t>(order_) + static_cast<std::size_t>(which[c])] = 1;
    klu_z_solve(symbolic_, numeric_, order_, static_cast<int>(which.size()),
                reinterpret_cast<double*>(x.data()), &common_);
  }

 private:
  int order_;
  std::vector<int> columns_;
  std::vector<int> rows_;
  std::vector<double> values_;
  klu_common common_{};
  klu_symbolic* symbolic_ = nullptr;
  klu_numeric* numeric_ = nullptr;
};

Eigen::SparseMatrix<Complex> full_matrix(const synthetic::NetworkMatrix& network) {
  std::vector<Eigen::Triplet<Complex>> entries;
  for (Index v = 0; v < network.order; ++v)
    entries.emplace_back(v, v, network.values.diagonal[static_cast<std::size_t>(v)][0]);
  for (std::size_t e = 0; e < network.edges.size(); ++e) {
    entries.emplace_back(network.edges[e].i, network.edges[e].j, network.values.off_diagonal[e][0]);
    entries.emplace_back(network.edges[e].j, network.edges[e].i, network.values.off_diagonal[e][0]);
  }
  Eigen::SparseMatrix<Complex> a(network.order, network.order);
  a.setFromTriplets(entries.begin(), entries.end());
  return a;
}

struct Ours {
  std::shared_ptr<const Analysis> analysis;
  std::unique_ptr<Factorisation<Complex, 1>> one;
  std::unique_ptr<Factorisation<Complex, 3>> three;
  InverseOnPattern<Complex, 1> inverse;
  InverseOnPattern<Complex, 3> inverse3;
};

struct Times {
  std::vector<double> cold, warm, warm_two_threads, lanes, lanes_two_threads, klu_factor, klu_refactor,
      klu_column, klu_block;
};

/// Largest |found - column| / |column| over Z_kk and Z_kj of the pattern in the columns measured.
double disagreement(const synthetic::NetworkMatrix& network, const Ours& ours, int k, const Complex* column) {
  const auto row = static_cast<std::size_t>(k);
  double worst = std::abs(ours.inverse.diagonal[row][0] - column[row]) / std::abs(column[row]);
  for (std::size_t e = 0; e < network.edges.size(); ++e) {
    const Edge& edge = network.edges[e];
    if (edge.i != k && edge.j != k) continue;
    const Complex expected = column[static_cast<std::size_t>(edge.i == k ? edge.j : edge.i)];
    worst = std::max(worst, std::abs(ours.inverse.off_diagonal[e][0] - expected) / std::abs(expected));
  }
  return worst;
}

void compare(Index order) {
  const synthetic::NetworkMatrix network = synthetic::network_matrix(order, kSeed);
  const Values<Complex, 1> positive = synthetic::lane(network, 0);
  const Eigen::SparseMatrix<Complex> a = full_matrix(network);
  const int repeats = order <= 200000 ? 7 : 3;
  Ours ours;
  std::unique_ptr<Klu> klu;
  Times times;
  const auto size = static_cast<std::size_t>(order);
  std::vector<Complex> x(size), block(size * kWidth);
  double worst = 0;
  for (int repeat = 0; repeat < repeats; ++repeat) {
    times.cold.push_back(milliseconds([&] {
      ours.analysis = std::make_shared<const Analysis>(order, network.edges);
      ours.one = std::make_unique<Factorisation<Complex, 1>>(ours.analysis, positive);
      ours.inverse = ours.one->selected_inverse();
    }));
    times.klu_factor.push_back(milliseconds([&] { klu = std::make_unique<Klu>(a); }));
    ours.three = std::make_unique<Factorisation<Complex, 3>>(ours.analysis, network.values);
    ours.three->selected_inverse(ours.inverse3);
    const auto warm = [&](auto& factorisation, const auto& values, auto& inverse, int threads) {
      return milliseconds([&] {
        factorisation.refactorise(values, threads);
        factorisation.selected_inverse(inverse, threads);
      });
    };
    times.warm.push_back(warm(*ours.one, positive, ours.inverse, 1));
    times.klu_refactor.push_back(milliseconds([&] { klu->refactor(); }));
    times.lanes.push_back(warm(*ours.three, network.values, ours.inverse3, 1));
    times.warm_two_threads.push_back(warm(*ours.one, positive, ours.inverse, 2));
    times.lanes_two_threads.push_back(warm(*ours.three, network.values, ours.inverse3, 2));
    const int columns = kColumns / repeats + 1;
    for (int c = 0; c < columns; ++c) {
      const int k = static_cast<int>((static_cast<long long>(repeat * columns + c) * 7919) % order);
      times.klu_column.push_back(milliseconds([&] { klu->columns({k}, x); }));
      if (c % 8 == 0) worst = std::max(worst, disagreement(network, ours, k, x.data()));
    }
    std::vector<int> which;
    for (int c = 0; c < kWidth; ++c)
      which.push_back(static_cast<int>((static_cast<long long>(c) * 104729 + repeat) % order));
    times.klu_block.push_back(milliseconds([&] { klu->columns(which, block); }) / kWidth);
  }
  double eigen_sweep = 0;
  if (order <= 100000) {
    Eigen::SparseLU<Eigen::SparseMatrix<Complex>> lu;
    eigen_sweep = milliseconds([&] { lu.compute(a); });
    Eigen::VectorXcd unit = Eigen::VectorXcd::Zero(order);
    std::vector<double> columns;
    for (int c = 0; c < 20; ++c) {
      unit.setZero();
      unit(c * 7919 % order) = 1;
      columns.push_back(milliseconds([&] { unit = lu.solve(unit).eval(); }));
    }
    eigen_sweep += order * median(columns);
  }
  const double cold = median(times.cold), warm = median(times.warm), lanes = median(times.lanes);
  const double factor = median(times.klu_factor), refactor = median(times.klu_refactor);
  const double sweep = factor + order * median(times.klu_column);
  const double block_sweep = factor + order * median(times.klu_block);
  std::printf("\n%d rows, %zu branches, L entries per row %.2f, tree height %d, seed %u\n", order,
              network.edges.size(), static_cast<double>(ours.analysis->factor_entries()) / order,
              ours.analysis->tree_height(), kSeed);
  std::printf("  ours, ms: cold %.2f  warm %.2f  (2 threads %.2f)  three lanes warm %.2f (2 threads %.2f)\n",
              cold, warm, median(times.warm_two_threads), lanes, median(times.lanes_two_threads));
  std::printf("  KLU, ms: analyse + factor %.2f  refactor %.2f  column %.4f  column in blocks of %d %.4f\n",
              factor, refactor, median(times.klu_column), kWidth, median(times.klu_block));
  std::printf("  KLU column sweep / ours cold            %10.0f\n", sweep / cold);
  std::printf("  KLU block sweep / ours cold             %10.0f\n", block_sweep / cold);
  if (eigen_sweep > 0) std::printf("  Eigen SparseLU column sweep / ours cold %10.0f\n", eigen_sweep / cold);
  std::printf("  KLU column sweep / ours warm            %10.0f\n",
              (refactor + order * median(times.klu_column)) / warm);
  std::printf("  ours warm / KLU refactor                %10.2f\n", warm / refactor);
  std::printf("  three lanes / one lane                  %10.2f\n", lanes / warm);
  std::printf("  one thread / two threads, one lane      %10.2f\n", warm / median(times.warm_two_threads));
  std::printf("  one thread / two threads, three lanes   %10.2f\n", lanes / median(times.lanes_two_threads));
  std::printf("  largest relative difference of entries  %10.1e\n", worst);
}

}  // namespace

int main(int argc, char** argv) {
  std::vector<Index> orders;
  for (int k = 1; k < argc; ++k) orders.push_back(std::atoi(argv[k]));
  if (orders.empty()) orders = {1000, 10000, 100000};
  for (const Index order : orders) compare(order);
  return 0;
}
