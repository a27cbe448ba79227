// One description of the fields of each element: it drives the reader, the writer and the JSON Schema.
#pragma once
#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

#include "engine/network/network.hpp"
#include "io/case_file/value.hpp"

namespace kiloamp::case_file {

enum class FieldType : std::uint8_t {
  number,
  integer,
  boolean,
  text,
  word,
  reference,
  object,
  object_list,
  reference_list,
  number_list
};

/// Which numbers a field takes.
enum class Range : std::uint8_t {
  any,
  positive,
  non_negative,
  not_zero,
  fraction,
  percent,
  integer_from_one,
  plus_minus_one
};
[[nodiscard]] bool in_range(Range range, double value);
/// "must be > 0", ready to print.
[[nodiscard]] const char* range_text(Range range);

/// What a reference may name.
enum class Target : std::uint8_t { bus, line, synchronous_machine, transformer, bus_switch, branch, any };
[[nodiscard]] bool fits(Target target, ElementKind kind);
/// "a bus", "a line", "an element".
[[nodiscard]] const char* target_text(Target target);

struct Table;

/// A field of an element. `set` stores a value that passed type and range; `write` appends the JSON text of
/// the value, or nothing and false when the user did not give it. References are stored by `set_reference`
/// once every id is known.
struct Field {
  std::string_view name;
  FieldType type = FieldType::number;
  Range range = Range::any;
  bool required = false;
  std::uint8_t fixed_count = 0;  ///< of a number_list: 0 any, 2 exactly two
  bool or_number = false;        ///< a number_list that also takes one plain number
  Target target = Target::bus;
  const std::vector<std::string_view>* words = nullptr;
  const Table* object = nullptr;
  std::string_view remedy;
  void (*set)(void* element, const Value& value, std::size_t index) = nullptr;
  void (*set_reference)(void* element, ElementRef target) = nullptr;
  void* (*make)(void* element) =
      nullptr;  ///< of an object: its storage, created; of a list: a new entry at its end
  const void* (*peek)(const void* element,
                      std::size_t index) = nullptr;  ///< of an object or list: its index-th entry, or null
  bool (*write)(const void* element, const Network& network, std::string& out) = nullptr;
};

/// Fields of which exactly one (or all of one group) is given.
struct Choice {
  std::vector<std::vector<std::string_view>> ways;  ///< each way: the fields that belong together
  bool required = true;                             ///< false: none is fine as well
  std::string_view remedy;
};

struct Table {
  ElementKind kind = ElementKind::bus;
  bool is_element = true;  ///< has id, in_service, note and x_ fields
  std::vector<Field> fields;
  std::vector<Choice> choices;
  void* (*append)(Network& network) = nullptr;
  void* (*element)(Network& network, std::size_t index) = nullptr;
  std::size_t (*count)(const Network& network) = nullptr;
  std::vector<std::int16_t> hash;  ///< open addressing over fields, by name

  [[nodiscard]] const Field* find(std::string_view name) const;
  void index();
};

/// The tables of the sections, by ElementKind.
[[nodiscard]] const Table& table(ElementKind kind);
inline constexpr std::size_t kSections = 19;

/// Shortest text that reads back as the same number.
void append_number(std::string& out, double value);
void append_quoted(std::string& out, std::string_view text);

}  // namespace kiloamp::case_file
