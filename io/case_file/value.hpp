// One element of a case while it is read: its tokens in a row, without a tree of allocations.
#pragma once
#include <cstdint>
#include <string>
#include <vector>

namespace kiloamp::case_file {

/// A token; an object's or array's own entries follow it up to `end`.
struct Value {
  enum class Type : std::uint8_t { null, boolean, number, text, object, array };
  Type type = Type::null;
  bool boolean = false;
  bool integer = false;
  double number = 0;
  std::string key;   ///< in an object; empty in an array
  std::string text;  ///< of a text; of a number as it stood in the file when it overflows a double
  std::size_t end = 0;
};

/// A row of values whose strings keep their memory from element to element.
class Values {
 public:
  void clear() { size_ = 0; }
  Value& add() {
    if (size_ == row_.size()) row_.emplace_back();
    Value& v = row_[size_++];
    v.key.clear();
    v.text.clear();
    return v;
  }
  [[nodiscard]] Value& operator[](std::size_t i) { return row_[i]; }
  [[nodiscard]] const Value& operator[](std::size_t i) const { return row_[i]; }
  [[nodiscard]] std::size_t size() const { return size_; }

 private:
  std::vector<Value> row_;
  std::size_t size_ = 0;
};

}  // namespace kiloamp::case_file
