// Pieces of sentences.
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

/// Both with a semicolon between, or the one that is not empty.
[[nodiscard]] inline std::string joined(const std::string& a, const std::string& b) {
  return a.empty() ? b : b.empty() ? a : a + "; " + b;
}

}  // namespace kiloamp::detail
