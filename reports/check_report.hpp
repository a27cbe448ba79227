// What `check` prints about a case that can be read.
#pragma once
#include <string>

#include "engine/study/study.hpp"

namespace kiloamp {

/// Counts of elements by kind, islands and earth paths of the state as written, defaults that a study would
/// use, warnings.
[[nodiscard]] std::string check_text(const Study& study, const std::string& file);

}  // namespace kiloamp
