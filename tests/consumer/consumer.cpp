// Another project that links the installed library: reads a case and prints the largest three-phase current
// in it.
#include <cstdio>

#include "engine/study/study.hpp"
#include "io/case_file/case_reader.hpp"

int main(int argc, char** argv) {
  if (argc != 2) return 2;
  kiloamp::ReadResult read = kiloamp::read_case(argv[1]);
  for (const auto& error : read.errors) std::fputs(kiloamp::render(error).c_str(), stderr);
  if (!read.network) return 2;
  kiloamp::StudyOptions options;
  options.kinds = {kiloamp::FaultKind::three_phase};
  const kiloamp::Study study(std::move(*read.network), options);
  double largest_ka = 0;
  kiloamp::BusIndex where{};
  study.for_each_fault([&](const kiloamp::FaultResult& result) {
    if (result.current_ka <= largest_ka) return;
    largest_ka = result.current_ka;
    where = result.fault.bus;
  });
  std::printf("largest three-phase current: %.3f kA at %s\n", largest_ka,
              study.network().bus(where).id.c_str());
  return largest_ka > 0 ? 0 : 1;
}
