// All single outages of a case by low-rank change, against a new factorisation and selected inverse for each,
// with the same core and the same number of threads.
//
// usage: outages_versus_refactorising CASE.json
// The refactorisation is timed on the intact network's pattern and multiplied by the number of outages.
#include <algorithm>
#include <chrono>
#include <cstdio>
#include <vector>

#include "engine/fault/fault_network.hpp"
#include "engine/study/outages.hpp"
#include "io/case_file/case_reader.hpp"

namespace {

template <typename Work>
double milliseconds(Work&& work) {
  const auto start = std::chrono::steady_clock::now();
  work();
  return std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - start).count();
}

}  // namespace

int main(int argc, char** argv) {
  using namespace kiloamp;
  if (argc != 2) {
    std::fprintf(stderr, "usage: outages_versus_refactorising CASE.json\n");
    return 2;
  }
  ReadResult read = read_case(argv[1]);
  if (!read.network) {
    std::fputs(render(read.errors).c_str(), stderr);
    return 2;
  }
  const Study study(std::move(*read.network), {});
  OutageOptions options;
  options.kinds = {ElementKind::line, ElementKind::transformer, ElementKind::three_winding_transformer,
                   ElementKind::series_reactor};
  // A matrix of branches of one admittance on the network's own pattern, in the memory of the first.
  const auto& factors = study.solver().solved().factors();
  const auto edges = factors.analysis().edges();
  sparse::Values<Complex, 3> values;
  const Complex y = 1.0 / Complex(0.01, 0.1), earth(0.01, -0.1);
  values.diagonal.assign(static_cast<std::size_t>(factors.analysis().order()), {earth, earth, earth});
  values.off_diagonal.assign(edges.size(), {-y, -y, -y});
  for (const sparse::Edge& e : edges)
    for (const sparse::Index row : {e.i, e.j})
      for (Complex& entry : values.diagonal[static_cast<std::size_t>(row)]) entry += y;
  const auto analysis = std::make_shared<const sparse::Analysis>(factors.analysis().order(), edges);
  sparse::Factorisation<Complex, 3> other(analysis, values);
  auto inverse = other.selected_inverse();
  std::printf("%d nodes, all buses, three sequences\n", factors.analysis().order());
  for (const int threads : {1, 2}) {
    options.threads = threads;
    OutageTable table;
    std::vector<double> all, one;
    for (int round = 0; round < 3; ++round) {
      all.push_back(milliseconds([&] { table = single_outages(study, options); }));
      for (int k = 0; k < 9; ++k)
        one.push_back(milliseconds([&] {
          other.refactorise(values, threads);
          other.selected_inverse(inverse, threads);
        }));
    }
    std::sort(all.begin(), all.end());
    std::sort(one.begin(), one.end());
    const double each = all[1] / static_cast<double>(table.outages), again = one[one.size() / 2];
    std::printf(
        "threads %d: %zu outages, %.3f ms each; refactorising and inverting %.3f ms each: %.1f times\n",
        threads, table.outages, each, again, again / each);
  }
  return 0;
}
