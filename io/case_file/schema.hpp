// The JSON Schema of a case, made from the same description that reads one.
#pragma once
#include <string>

namespace kiloamp {

/// JSON Schema, draft 2020-12. It states what a schema can: names, types, ranges, required fields, exclusive
/// groups, words. References, voltages across branches and the like are the reader's.
[[nodiscard]] std::string case_schema();

}  // namespace kiloamp
