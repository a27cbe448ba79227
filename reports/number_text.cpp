#include "reports/number_text.hpp"

#include <charconv>
#include <cmath>
#include <cstdint>

namespace kiloamp {

namespace {
constexpr std::int64_t kPower[] = {1, 10, 100, 1000, 10000, 100000, 1000000, 10000000, 100000000, 1000000000};
constexpr double kScaledLimit = 1e9;  // 1e9 * 1e9 still fits 63 bits
}  // namespace

void append_fixed(std::string& out, double value, int decimals) {
  if (!std::isfinite(value)) return;
  char buffer[400];
  if (std::abs(value) >= kScaledLimit) {
    out.append(buffer,
               std::to_chars(buffer, buffer + sizeof buffer, value, std::chars_format::fixed, decimals).ptr);
    return;
  }
  const std::int64_t scaled = std::llround(std::abs(value) * static_cast<double>(kPower[decimals]));
  if (value < 0 && scaled != 0) out += '-';
  char* end = std::to_chars(buffer, buffer + sizeof buffer, scaled / kPower[decimals]).ptr;
  if (decimals > 0) {
    *end++ = '.';
    std::int64_t rest = scaled % kPower[decimals];
    for (int d = decimals - 1; d >= 0; --d, rest /= 10) end[d] = static_cast<char>('0' + rest % 10);
    end += decimals;
  }
  out.append(buffer, end);
}

void append_shortest(std::string& out, double value) {
  if (!std::isfinite(value)) {
    out += "null";
    return;
  }
  char buffer[32];
  out.append(buffer, std::to_chars(buffer, buffer + sizeof buffer, value).ptr);
}

std::string readable(double value) {
  std::string out;
  const double size = std::abs(value);
  if (size == 0) return "0.0";
  if (size < 1e-5 || size >= kScaledLimit) {
    char buffer[32];
    out.append(buffer,
               std::to_chars(buffer, buffer + sizeof buffer, value, std::chars_format::scientific, 2).ptr);
    return out;
  }
  const int digits = static_cast<int>(std::floor(std::log10(size)));  // of the leading figure
  append_fixed(out, value, std::min(6, std::max(1, 3 - digits)));
  return out;
}

}  // namespace kiloamp
