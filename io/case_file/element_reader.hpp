// Binds the values of one element to its fields.
#pragma once
#include <array>
#include <set>

#include "engine/network/id_table.hpp"
#include "io/case_file/case_reader.hpp"
#include "io/case_file/field_table.hpp"
#include "io/case_file/value.hpp"

namespace kiloamp::case_file {

/// Collects errors with their place in the order of the file.
class Complaints {
 public:
  explicit Complaints(std::string file) : file_(std::move(file)) {}
  void add(std::size_t order, std::string element, std::string fault, std::string allowed,
           std::string remedy);
  /// Takes those of `other` too and leaves it empty.
  void join(Complaints& other);
  /// Sorted by order; the collection is empty afterwards.
  [[nodiscard]] std::vector<InputError> take();
  [[nodiscard]] bool empty() const { return errors_.empty(); }
  [[nodiscard]] const std::string& file() const { return file_; }

 private:
  struct Placed {
    std::size_t order;
    InputError error;
  };
  std::string file_;
  std::vector<Placed> errors_;
};

/// A reference whose id was not known yet when it was read.
struct Pending {
  ElementRef owner;
  std::size_t order;
  const Field* field;
  std::string id;
};

/// How an element is named in messages: `line "L-3" (/lines/2)`.
[[nodiscard]] std::string name_of(ElementKind kind, std::string_view id, std::size_t index);

class ElementReader {
 public:
  ElementReader(Network& network, Complaints& complaints) : network_(network), complaints_(complaints) {}

  /// Makes room for the ids of so many elements.
  void expect(std::size_t elements) { ids_.reserve(elements); }
  /// values[0] is the element's object. Appends the element to its section.
  void read(ElementKind kind, const Values& values);
  /// After the last section.
  void resolve_references();

  /// Elements with an error of their own.
  [[nodiscard]] bool is_bad(ElementRef ref) const;
  /// Place in the file's order of the first element of a section.
  [[nodiscard]] std::size_t order_of(ElementRef ref) const {
    return first_order_[static_cast<std::size_t>(ref.kind)] + ref.index;
  }

 private:
  struct Scope;  // where in an element the reading is
  void read_object(const Table& table, const Values& values, std::size_t at, const Scope& scope);
  void read_field(const Field& field, const Values& values, std::size_t at, const Scope& scope);
  void read_common(const Values& values, std::size_t at, const Scope& scope);
  void read_list(const Field& field, const Values& values, std::size_t at, const Scope& scope);
  void check_choices(const Table& table, const std::vector<const Field*>& present, const Scope& scope);
  void take_reference(const Field& field, const std::string& id, const Scope& scope);
  void set_reference(const Pending& pending, ElementRef target);
  void complain(const Scope& scope, std::string fault, std::string allowed, std::string_view remedy);
  void take_id(const Values& values, const Scope& scope);

  Network& network_;
  Complaints& complaints_;
  IdTable ids_;
  std::vector<Pending> pending_;
  std::set<ElementRef> bad_;
  std::array<std::size_t, kSections> first_order_{};
  std::size_t order_ = 0;
};

/// The JSON text of values[at], for a user's own field.
void append_json(std::string& out, const Values& values, std::size_t at);
/// A value as a message shows it: short, on one line.
[[nodiscard]] std::string shown(const Value& value);

}  // namespace kiloamp::case_file
