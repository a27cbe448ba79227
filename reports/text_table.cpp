#include "reports/text_table.hpp"

#include <algorithm>

namespace kiloamp {

namespace {

constexpr std::size_t kSpace = 2;
constexpr std::size_t kNarrowest = 8;

struct CodePoint {
  char32_t value;
  std::size_t bytes;
};
CodePoint code_point(const std::string& text, std::size_t at) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(i < text.size() ? text[i] : 0); };
  const unsigned char first = byte(at);
  if (first < 0x80) return {first, 1};
  if (first < 0xE0) return {static_cast<char32_t>((first & 0x1FU) << 6 | (byte(at + 1) & 0x3FU)), 2};
  if (first < 0xF0)
    return {
        static_cast<char32_t>((first & 0x0FU) << 12 | (byte(at + 1) & 0x3FU) << 6 | (byte(at + 2) & 0x3FU)),
        3};
  return {static_cast<char32_t>((first & 0x07U) << 18 | (byte(at + 1) & 0x3FU) << 12 |
                                (byte(at + 2) & 0x3FU) << 6 | (byte(at + 3) & 0x3FU)),
          4};
}
std::size_t width_of(char32_t c) {
  if (c >= 0x0300 && c <= 0x036F) return 0;  // combining marks
  const bool wide = (c >= 0x1100 && c <= 0x115F) || (c >= 0x2E80 && c <= 0xA4CF) ||
                    (c >= 0xAC00 && c <= 0xD7A3) || (c >= 0xF900 && c <= 0xFAFF) ||
                    (c >= 0xFE30 && c <= 0xFE6F) || (c >= 0xFF00 && c <= 0xFF60) || c >= 0x1F300;
  return wide ? 2 : 1;
}

// Digits before the point, and the point with what follows.
std::pair<std::size_t, std::size_t> split(const std::string& cell) {
  const auto point = cell.find('.');
  if (point == std::string::npos) return {cell.size(), 0};
  return {point, cell.size() - point};
}

void pad(std::string& out, std::size_t count) { out.append(count, ' '); }

}  // namespace

std::size_t display_width(const std::string& text) {
  std::size_t width = 0;
  for (std::size_t i = 0; i < text.size();) {
    const CodePoint c = code_point(text, i);
    width += width_of(c.value);
    i += c.bytes;
  }
  return width;
}

std::string shortened(const std::string& text, std::size_t width) {
  if (display_width(text) <= width) return text;
  std::vector<CodePoint> points;
  for (std::size_t i = 0; i < text.size(); i += points.back().bytes) points.push_back(code_point(text, i));
  const std::size_t room = width - 1, front_room = (room + 1) / 2;
  std::string front, back;
  std::size_t at = 0, used = 0;
  for (const CodePoint& c : points) {
    if (used + width_of(c.value) > front_room) break;
    used += width_of(c.value);
    front += text.substr(at, c.bytes);
    at += c.bytes;
  }
  std::size_t end = text.size();
  for (auto c = points.rbegin(); c != points.rend() && used + width_of(c->value) <= room; ++c) {
    used += width_of(c->value);
    end -= c->bytes;
    back.insert(0, text.substr(end, c->bytes));
  }
  return front + "…" + back;
}

void TextTable::column(std::string heading, std::string unit, Align align) {
  columns_.push_back({std::move(heading), std::move(unit), align});
}

void TextTable::row(std::vector<std::string> cells) { rows_.push_back(std::move(cells)); }

void TextTable::measure() {
  for (std::size_t c = 0; c < columns_.size(); ++c) {
    Column& column = columns_[c];
    column.before = column.after = 0;
    for (const auto& row : rows_) {
      if (column.align == Align::left) {
        column.before = std::max(column.before, display_width(row[c]));
        continue;
      }
      const auto [before, after] = split(row[c]);
      column.before = std::max(column.before, before);
      column.after = std::max(column.after, after);
    }
    const std::size_t head = std::max(display_width(column.heading), display_width(column.unit));
    if (head > column.width()) column.before += head - column.width();
  }
  std::size_t total = kSpace * (columns_.size() - 1);
  for (const Column& column : columns_) total += column.width();
  while (total > kTextWidth) {  // take from the widest left column
    Column* widest = nullptr;
    for (Column& column : columns_)
      if (column.align == Align::left && column.before > kNarrowest &&
          (widest == nullptr || column.before > widest->before))
        widest = &column;
    if (widest == nullptr) break;
    --widest->before;
    --total;
    shortened_ = true;
  }
}

std::string TextTable::text() {
  measure();
  std::string out;
  const auto line = [&](const auto& cell) {
    std::string text;
    for (std::size_t c = 0; c < columns_.size(); ++c) {
      if (c > 0) pad(text, kSpace);
      cell(text, c);
    }
    text.erase(text.find_last_not_of(' ') + 1);
    out += text + '\n';
  };
  const auto head = [&](std::string& text, std::size_t c, const std::string& words) {
    const std::size_t space = columns_[c].width() - display_width(words);
    if (columns_[c].align == Align::decimal) pad(text, space);
    text += words;
    if (columns_[c].align == Align::left) pad(text, space);
  };
  line([&](std::string& text, std::size_t c) { head(text, c, columns_[c].heading); });
  line([&](std::string& text, std::size_t c) { head(text, c, columns_[c].unit); });
  std::size_t next_gap = 0;
  for (std::size_t r = 0; r < rows_.size(); ++r) {
    for (; next_gap < gaps_.size() && gaps_[next_gap] <= r; ++next_gap)
      if (gaps_[next_gap] == r && r > 0) out += '\n';
    line([&](std::string& text, std::size_t c) {
      const Column& column = columns_[c];
      if (column.align == Align::left) {
        const std::string cell = shortened(rows_[r][c], column.before);
        text += cell;
        pad(text, column.before - display_width(cell));
        return;
      }
      const auto [before, after] = split(rows_[r][c]);
      pad(text, column.before - before);
      text += rows_[r][c];
      pad(text, column.after - after);
    });
  }
  return out;
}

}  // namespace kiloamp
