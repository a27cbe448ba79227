// A case file becomes a Network, or a list of located errors.
#pragma once
#include <filesystem>
#include <future>
#include <string>
#include <string_view>
#include <vector>

#include "engine/network/finding.hpp"

namespace kiloamp {

/// One complaint about the input, ready to be printed.
struct InputError {
  std::string file;
  std::string element;  ///< `line "L-3" (/lines/2)`, or a place in the text, or empty
  std::string fault;    ///< `x1_ohm_per_km = -0.4`
  std::string allowed;  ///< what would be right
  std::string remedy;
};

/// Three lines: file, element and fault; what is allowed; the remedy.
[[nodiscard]] std::string render(const InputError& error);
/// All of them, the first 100 in full and the count of the rest.
[[nodiscard]] std::string render(const std::vector<InputError>& errors);

/// A finding of the engine in the same form; `network` is the one it is about.
[[nodiscard]] InputError located(const std::string& file, const Network& network, const Finding& finding);

struct ReadResult {
  std::optional<Network> network;   ///< empty exactly when there are errors
  std::vector<InputError> errors;   ///< in the order of the file
  std::vector<InputError> remarks;  ///< values outside their usual range; they stop nothing
  /// Of the bytes that were read, lower-case hexadecimal; computed when it is first asked for.
  std::shared_future<std::string> sha256;
};

/// Reads by events, one element at a time: memory is that of the network, the text and one element.
/// Never throws for anything in the file or about the file; a path of "-" is standard input.
[[nodiscard]] ReadResult read_case(const std::filesystem::path& path);
[[nodiscard]] ReadResult read_case_text(std::string_view text, const std::string& file);

/// The known word nearest to `word`, when one is near enough to be meant; empty otherwise.
[[nodiscard]] std::string nearest(std::string_view word, const std::vector<std::string_view>& known);

}  // namespace kiloamp
