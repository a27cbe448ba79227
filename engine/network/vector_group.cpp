#include <cctype>
#include <string_view>

#include "engine/network/branches.hpp"

namespace kiloamp {

namespace {

// Takes one winding symbol off the front of `text`: D, Y, YN, Z, ZN in the given case; an `a` stands for the
// auto-connected star.
std::optional<Winding> take_winding(std::string_view& text, bool high_voltage, bool* auto_symbol) {
  if (text.empty()) return std::nullopt;
  const char first = text.front();
  if (!high_voltage && first == 'a' && auto_symbol != nullptr) {
    *auto_symbol = true;
    text.remove_prefix(1);
    return Winding::star_neutral;
  }
  const bool upper = std::isupper(static_cast<unsigned char>(first)) != 0;
  if (upper != high_voltage) return std::nullopt;
  text.remove_prefix(1);
  const char neutral = high_voltage ? 'N' : 'n';
  const bool with_neutral = !text.empty() && text.front() == neutral;
  switch (std::tolower(static_cast<unsigned char>(first))) {
    case 'd':
      return Winding::delta;
    case 'y':
      if (with_neutral) text.remove_prefix(1);
      return with_neutral ? Winding::star_neutral : Winding::star;
    case 'z':
      if (with_neutral) text.remove_prefix(1);
      return with_neutral ? Winding::zigzag_neutral : Winding::zigzag;
    default:
      return std::nullopt;
  }
}

// Takes a clock number 0..11; none is written behind a winding whose number is understood (an auto-connected
// one: 0).
std::optional<int> take_clock(std::string_view& text) {
  int value = 0;
  std::size_t digits = 0;
  while (digits < text.size() && digits < 2 && std::isdigit(static_cast<unsigned char>(text[digits])) != 0)
    value = 10 * value + (text[digits++] - '0');
  if (digits == 0 || value > 11) return std::nullopt;
  if (digits == 2 && text.front() == '0') return std::nullopt;
  text.remove_prefix(digits);
  return value;
}

// A star's own phase voltage is turned by 30 degrees against both a delta's and a zigzag's; a delta and a
// zigzag agree.
bool parity_exists(Winding hv, Winding lower, int clock) {
  const auto is_star = [](Winding w) { return w == Winding::star || w == Winding::star_neutral; };
  const bool odd = is_star(hv) != is_star(lower);
  return (clock % 2 == 1) == odd;
}

}  // namespace

std::optional<VectorGroup> parse_vector_group(const std::string& text) {
  VectorGroup group;
  group.text = text;
  std::string_view rest = text;
  const auto hv = take_winding(rest, true, nullptr);
  if (!hv) return std::nullopt;
  group.hv = *hv;
  while (!rest.empty() && group.lower.size() < 2) {
    bool is_auto = false;
    const auto winding = take_winding(rest, false, &is_auto);
    if (!winding) return std::nullopt;
    auto clock = take_clock(rest);
    if (!clock && is_auto) clock = 0;
    if (!clock || !parity_exists(group.hv, *winding, *clock)) return std::nullopt;
    if (is_auto && (group.hv != Winding::star_neutral || *clock != 0 || !group.lower.empty()))
      return std::nullopt;
    group.auto_symbol = group.auto_symbol || is_auto;
    group.lower.push_back({*winding, *clock});
  }
  if (!rest.empty() || group.lower.empty()) return std::nullopt;
  return group;
}

}  // namespace kiloamp
