// The command line as data.
#pragma once
#include <iosfwd>
#include <optional>
#include <string>
#include <vector>

#include "engine/study/duty.hpp"
#include "engine/study/outages.hpp"
#include "engine/study/relays.hpp"

namespace kiloamp {

struct Command {
  std::string verb;  ///< check, sweep, fault, outages, duty, relays
  std::string case_file;
  std::vector<std::string> buses;
  std::optional<std::string> scenario;
  StudyOptions study;  ///< all but buses and scenario, which need the network
  std::string format = "text";
  std::string table = "faults";
  std::optional<std::string> output;
  OutageOptions outages;  ///< of the verb outages; threads are those of the study
  DutyOptions duty;       ///< of the verb duty; study and scenario are those of the command
  RelayOptions relays;    ///< of the verb relays; study is that of the command
  bool strict = false;    ///< duty: exit 3 unless every device is within or marginal
  bool contributions = false;
  bool both_kinds = false;  ///< study.case_kind is max; min is wanted too
  bool intermediate = false;
  bool cross_check = false;
  bool timing = false;
};

/// @return the command, or the exit code when there is nothing to run: help and version went to `out`,
/// complaints to `err`.
struct Parsed {
  std::optional<Command> command;
  int exit_code = 0;
};
[[nodiscard]] Parsed parse(std::vector<std::string> arguments, std::ostream& out, std::ostream& err);

}  // namespace kiloamp
