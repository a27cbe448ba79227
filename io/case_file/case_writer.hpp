// A Network becomes the text of a case file.
#pragma once
#include <string>

#include "engine/network/network.hpp"

namespace kiloamp {

/// Everything that was given, nothing that was not, one element to a line; numbers are the shortest that read
/// back the same. Reading the text gives the same network, and the same JSON values as the text it was read
/// from.
[[nodiscard]] std::string write_case(const Network& network);

}  // namespace kiloamp
