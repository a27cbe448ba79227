// A table in plain text: columns aligned on the decimal point, headed with their unit, at most 120 characters
// wide.
#pragma once
#include <string>
#include <vector>

namespace kiloamp {

inline constexpr std::size_t kTextWidth = 120;

/// Characters of a UTF-8 text as a terminal counts them, close enough for ids: one per code point, two for
/// wide East Asian ones.
[[nodiscard]] std::size_t display_width(const std::string& text);
/// Cut in the middle with an ellipsis to at most `width`.
[[nodiscard]] std::string shortened(const std::string& text, std::size_t width);

class TextTable {
 public:
  enum class Align { left, decimal };

  /// `unit` stands under the heading; left columns may be shortened to make the table fit.
  void column(std::string heading, std::string unit, Align align);
  void row(std::vector<std::string> cells);
  /// A blank line before the next row.
  void gap() { gaps_.push_back(rows_.size()); }

  [[nodiscard]] bool empty() const { return rows_.empty(); }
  /// The table, each line with its end. Sets shortened() when an id had to be cut.
  [[nodiscard]] std::string text();
  [[nodiscard]] bool was_shortened() const { return shortened_; }

 private:
  struct Column {
    std::string heading, unit;
    Align align;
    std::size_t before = 0, after = 0;  // of the decimal point; left columns: before is the width
    [[nodiscard]] std::size_t width() const { return before + after; }
  };
  void measure();

  std::vector<Column> columns_;
  std::vector<std::vector<std::string>> rows_;
  std::vector<std::size_t> gaps_;
  bool shortened_ = false;
};

}  // namespace kiloamp
