// What is to be said about the data: errors that stop a study, and remarks that do not.
#pragma once
#include <functional>
#include <string>
#include <vector>

#include "engine/network/network.hpp"

namespace kiloamp {

enum class Severity : std::uint8_t { error, remark };

/// One complaint about one field of one element. For two entries in conflict, `found` shows both.
struct Finding {
  Severity severity = Severity::error;
  std::optional<ElementRef> element;  ///< empty: the case as a whole
  std::string field;                  ///< name in the case file, dotted into objects ("max.x_over_r")
  std::string found;                  ///< the value as a reader would write it
  std::string allowed;                ///< what would be right
  std::string remedy;
};

/// Errors (not physical, or contradictory) and remarks (outside the usual range) on a network whose fields
/// are each in range.
///
/// Errors: fault levels of a feeder from which no physical Z0 follows (the other reading of the earth-fault
/// MVA is tried and named when it would be physical); rated voltages that do not fit the buses; different
/// nominal voltages across a line, reactor or switch; neutral data for a winding without neutral; machine
/// reactances out of order; coupling longer than a line, of a line with itself or stronger than the lines'
/// own zero-sequence reactance; a unit whose machine is not at its transformer. Remarks: values outside the
/// plausible ranges, each range with its source in plausibility.cpp.
///
/// `skip` names elements that are not to be judged: those whose references could not be resolved.
[[nodiscard]] std::vector<Finding> judge(const Network& network,
                                         const std::function<bool(ElementRef)>& skip = {});

/// A value that the user left out and what was taken for it.
struct DefaultUse {
  std::string field;
  std::string value;   ///< in words, with its unit
  std::string source;  ///< published source, or "common practice, no source"
  std::vector<ElementRef> elements;
};

/// Fills what was left out, in place, and lists it, one entry per rule that was used. Afterwards every field
/// that a study reads is there, except those whose absence means something: no earth-fault level of a feeder
/// (no zero-sequence path), no magnetising branch (infinite), no charging (none).
[[nodiscard]] std::vector<DefaultUse> fill_defaults(Network& network);

}  // namespace kiloamp
