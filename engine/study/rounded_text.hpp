// Numbers inside sentences.
#pragma once
#include <array>
#include <charconv>
#include <string>

namespace kiloamp::detail {

/// `value` rounded to `decimals` digits behind the point.
[[nodiscard]] inline std::string rounded_text(double value, int decimals) {
  std::array<char, 64> text{};
  const auto end =
      std::to_chars(text.data(), text.data() + text.size(), value, std::chars_format::fixed, decimals);
  return {text.data(), end.ptr};
}

}  // namespace kiloamp::detail
