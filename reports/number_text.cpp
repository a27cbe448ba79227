#include "reports/number_text.hpp"

#include <array>
#include <charconv>
#include <cmath>
#include <cstdint>
#include <cstring>

namespace kiloamp {

namespace {
constexpr std::int64_t kPower[] = {1, 10, 100, 1000, 10000, 100000, 1000000, 10000000, 100000000, 1000000000};
constexpr double kScaledLimit = 1e9;  // 1e9 * 1e9 still fits 63 bits

// 00 to 99.
constexpr auto kPairs = [] {
  std::array<char, 200> pairs{};
  for (std::size_t n = 0; n < 100; ++n) {
    pairs[2 * n] = static_cast<char>('0' + n / 10);
    pairs[2 * n + 1] = static_cast<char>('0' + n % 10);
  }
  return pairs;
}();

// The last `digits` digits of value, ending before `at`; returns where they begin.
char* put_digits(char* at, std::uint64_t value, int digits) {
  for (; digits >= 2; digits -= 2, value /= 100) {
    at -= 2;
    std::memcpy(at, &kPairs[2 * (value % 100)], 2);
  }
  if (digits == 1) *--at = static_cast<char>('0' + value % 10);
  return at;
}
}  // namespace

void append_fixed(std::string& out, double value, int decimals) {
  if (!std::isfinite(value)) return;
  char buffer[400];
  if (std::abs(value) >= kScaledLimit) {
    out.append(buffer,
               std::to_chars(buffer, buffer + sizeof buffer, value, std::chars_format::fixed, decimals).ptr);
    return;
  }
  const double wanted = std::abs(value) * static_cast<double>(kPower[decimals]);
  auto scaled = static_cast<std::uint64_t>(wanted + 0.5);
  if (static_cast<double>(scaled) - wanted > 0.5) --scaled;  // the sum itself was rounded up
  char* const end = buffer + sizeof buffer;
  char* at = end;
  const auto power = static_cast<std::uint64_t>(kPower[decimals]);
  std::uint64_t whole = scaled / power;
  if (decimals > 0) {
    at = put_digits(at, scaled % power, decimals);
    *--at = '.';
  }
  int digits = 1;
  for (std::uint64_t rest = whole; rest >= 10; rest /= 10) ++digits;
  at = put_digits(at, whole, digits);
  if (value < 0 && scaled != 0) *--at = '-';
  out.append(at, end);
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
