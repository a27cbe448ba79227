// The program behind `kiloamp`, callable from tests.
#pragma once
#include <iosfwd>
#include <string>
#include <vector>

namespace kiloamp {

enum ExitCode : int {
  kRan = 0,            ///< the study ran
  kNotComputed = 1,    ///< it could not be computed, or a cross-check disagreed
  kInputWrong = 2,     ///< command line or case file; nothing was written
  kDutyNotProven = 3,  ///< duty --strict: a device is over, or not evaluated; the report is written
};

/// Runs one command; `arguments` are those behind the program's name.
[[nodiscard]] int run(std::vector<std::string> arguments, std::ostream& out, std::ostream& err);

}  // namespace kiloamp
