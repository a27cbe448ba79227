#include "io/case_file/field_table.hpp"

#include <charconv>
#include <cmath>

namespace kiloamp::case_file {

bool in_range(Range range, double v) {
  if (!std::isfinite(v)) return false;
  switch (range) {
    case Range::any:
      return true;
    case Range::positive:
      return v > 0;
    case Range::non_negative:
      return v >= 0;
    case Range::not_zero:
      return v != 0;
    case Range::fraction:
      return v > 0 && v <= 1;
    case Range::percent:
      return v > 0 && v <= 100;
    case Range::integer_from_one:
      return v >= 1 && v <= 1e6;
    case Range::plus_minus_one:
      return v == 1 || v == -1;
  }
  return false;
}

const char* range_text(Range range) {
  switch (range) {
    case Range::any:
      return "must be a finite number";
    case Range::positive:
      return "must be > 0";
    case Range::non_negative:
      return "must be >= 0";
    case Range::not_zero:
      return "must not be 0";
    case Range::fraction:
      return "must be > 0 and at most 1";
    case Range::percent:
      return "must be > 0 and at most 100";
    case Range::integer_from_one:
      return "must be a whole number from 1 to 1000000";
    case Range::plus_minus_one:
      return "must be 1 or -1";
  }
  return "";
}

bool fits(Target target, ElementKind kind) {
  switch (target) {
    case Target::bus:
      return kind == ElementKind::bus;
    case Target::line:
      return kind == ElementKind::line;
    case Target::synchronous_machine:
      return kind == ElementKind::synchronous_machine;
    case Target::transformer:
      return kind == ElementKind::transformer;
    case Target::bus_switch:
      return kind == ElementKind::bus_switch;
    case Target::branch:
      return kind != ElementKind::bus && kind != ElementKind::mutual_coupling &&
             kind < ElementKind::power_station_unit;
    case Target::any:
      return kind != ElementKind::scenario;
  }
  return false;
}

const char* target_text(Target target) {
  switch (target) {
    case Target::bus:
      return "a bus";
    case Target::line:
      return "a line";
    case Target::synchronous_machine:
      return "a synchronous machine";
    case Target::transformer:
      return "a transformer";
    case Target::bus_switch:
      return "a switch";
    case Target::branch:
      return "an element connected to a bus";
    case Target::any:
      return "an element";
  }
  return "";
}

namespace {
std::size_t hash_of(std::string_view name) {
  std::size_t h = 1469598103934665603ULL;
  for (const char c : name) h = (h ^ static_cast<unsigned char>(c)) * 1099511628211ULL;
  return h ^ (h >> 29);
}
}  // namespace

const Field* Table::find(std::string_view name) const {
  const std::size_t mask = hash.size() - 1;
  for (std::size_t slot = hash_of(name) & mask;; slot = (slot + 1) & mask) {
    if (hash[slot] < 0) return nullptr;
    const Field& field = fields[static_cast<std::size_t>(hash[slot])];
    if (field.name == name) return &field;
  }
}

void Table::index() {
  std::size_t size = 8;
  while (size < 3 * fields.size()) size *= 2;
  hash.assign(size, -1);
  for (std::size_t f = 0; f < fields.size(); ++f) {
    std::size_t slot = hash_of(fields[f].name) & (size - 1);
    while (hash[slot] >= 0) slot = (slot + 1) & (size - 1);
    hash[slot] = static_cast<std::int16_t>(f);
  }
}

void append_number(std::string& out, double value) {
  char buffer[32];
  const auto end = std::to_chars(buffer, buffer + sizeof buffer, value).ptr;
  out.append(buffer, end);
}

void append_quoted(std::string& out, std::string_view text) {
  static constexpr char kHex[] = "0123456789abcdef";
  out += '"';
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    if (c == '"' || c == '\\') {
      out += '\\';
      out += c;
    } else if (byte < 0x20) {
      out += "\\u00";
      out += kHex[byte >> 4];
      out += kHex[byte & 15];
    } else {
      out += c;
    }
  }
  out += '"';
}

}  // namespace kiloamp::case_file
