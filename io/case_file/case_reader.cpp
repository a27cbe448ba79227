#include "io/case_file/case_reader.hpp"

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <fstream>
#include <future>
#include <iostream>
#include <iterator>
#include <nlohmann/json.hpp>

#include "io/case_file/element_queue.hpp"
#include "io/case_file/element_reader.hpp"
#include "io/case_file/sha256.hpp"

namespace kiloamp {

namespace {

using case_file::Complaints;
using case_file::ElementQueue;
using case_file::ElementReader;
using case_file::Value;
using case_file::Values;
using nlohmann::json;

constexpr std::size_t kDeepest = 32;
constexpr std::size_t kMostShown = 100;
constexpr std::size_t kBytesOfElement = 130;  // of a usual case; only how much room is made depends on it

const std::vector<std::string_view>& root_fields() {
  static const std::vector<std::string_view> fields = [] {
    std::vector<std::string_view> all{"format",       "version",  "title",
                                      "frequency_hz", "base_mva", "prefault_pu"};
    for (std::size_t k = 0; k < case_file::kSections; ++k)
      all.push_back(section_name(static_cast<ElementKind>(k)));
    return all;
  }();
  return fields;
}

std::string place_in_text(std::string_view text, std::size_t position) {
  position = std::min(position, text.size());
  const auto before = text.substr(0, position == 0 ? 0 : position - 1);
  const auto line = 1 + std::count(before.begin(), before.end(), '\n');
  const auto start = before.rfind('\n');
  const std::size_t column = before.size() - (start == std::string_view::npos ? 0 : start + 1) + 1;
  return "line " + std::to_string(line) + ", column " + std::to_string(column);
}

// Receives the document's events; builds one element at a time in `values_` and hands it on.
class Receiver {
 public:
  Receiver(Network& network, Complaints& complaints, ElementQueue& elements, std::string_view text)
      : network_(network), complaints_(complaints), elements_(elements), text_(text) {}

  bool null() {
    return put([](Value&) {});
  }
  bool boolean(bool value) {
    return put([&](Value& v) {
      v.type = Value::Type::boolean;
      v.boolean = value;
    });
  }
  bool number_integer(json::number_integer_t value) { return integer(value); }
  bool number_unsigned(json::number_unsigned_t value) { return integer(value); }
  bool number_float(json::number_float_t value, const std::string&) {
    return put([&](Value& v) {
      v.type = Value::Type::number;
      v.integer = false;
      v.number = value;
    });
  }
  bool string(std::string& value) {
    return put([&](Value& v) {
      v.type = Value::Type::text;
      v.text = value;
    });
  }
  bool binary(json::binary_t&) { return false; }
  bool key(std::string& name) {
    key_ = name;
    return true;
  }
  bool start_object(std::size_t) { return open(Value::Type::object); }
  bool start_array(std::size_t) { return open(Value::Type::array); }
  bool end_object() { return close(); }
  bool end_array() { return close(); }

  bool parse_error(std::size_t position, const std::string& token, const json::exception& error) {
    const std::string place = place_in_text(text_, position);
    const std::string what = error.what();
    if (what.find("ill-formed UTF-8") != std::string::npos)
      syntax(place, "bytes that are not UTF-8", "must be UTF-8 text", "save the file as UTF-8");
    else if (error.id == 406)
      syntax(place, "the number " + token + " is too large", "must be a number within the range of a double",
             "correct the number");
    else if (position >= text_.size())
      syntax(place, "the text ends in the middle of the document", "must be one whole JSON document",
             "the file may be cut off: get it again or close what is open");
    else
      syntax(place, "not JSON at " + around(position), "must be one JSON document (RFC 8259)",
             "look for a missing comma, quote or bracket here or just before");
    return false;
  }

  /// After a document that was read to its end.
  void finish() {
    if (!root_is_object_) return;
    const auto need = [&](std::string_view name, const char* allowed, const char* remedy) {
      if (std::find(seen_.begin(), seen_.end(), name) == seen_.end())
        root(std::string(name) + " is missing", allowed, remedy);
    };
    need("format", "must be \"kiloamp-case\"", "add \"format\": \"kiloamp-case\"");
    need("version", "must be 1", "add \"version\": 1");
    need("frequency_hz", "must be the rated frequency, in Hz", "add \"frequency_hz\": 50 or 60");
    need("buses", "must be a list of at least one bus", "add the buses");
  }
  [[nodiscard]] bool gave_up() const { return gave_up_; }

 private:
  template <typename Number>
  bool integer(Number value) {
    return put([&](Value& v) {
      v.type = Value::Type::number;
      v.integer = true;
      v.number = static_cast<double>(value);
      v.text = std::to_string(value);
    });
  }

  // A few characters of the text from `position` on, for a message.
  [[nodiscard]] std::string around(std::size_t position) const {
    std::string out = "\"";
    for (std::size_t i = position == 0 ? 0 : position - 1; i < text_.size() && out.size() < 16; ++i) {
      if (static_cast<unsigned char>(text_[i]) < 0x20 || static_cast<unsigned char>(text_[i]) > 0x7E) break;
      out += text_[i];
    }
    return out + '"';
  }

  void syntax(const std::string& place, std::string fault, std::string allowed, std::string remedy) {
    complaints_.add(0, place, std::move(fault), std::move(allowed), std::move(remedy));
    gave_up_ = true;
  }
  void root(std::string fault, std::string allowed, std::string remedy) {
    complaints_.add(0, {}, std::move(fault), std::move(allowed), std::move(remedy));
  }

  // An element, or a field of the document, is collected from here on.
  void begin() {
    values_ = section_ ? &elements_.next() : &root_values_;
    values_->clear();
  }

  // Containers opened within what is being collected stand in open_.
  template <typename Fill>
  bool put(Fill&& fill) {
    if (depth_ == 0) {
      root("the document is not an object", "must be an object, { \"format\": \"kiloamp-case\", ... }",
           "give the file of a case");
      return true;
    }
    const bool top = depth_ == 1 || (depth_ == 2 && section_);
    if (top) begin();
    Value& v = values_->add();
    v.type = Value::Type::null;
    v.integer = false;
    if (open_.empty() || (*values_)[open_.back()].type == Value::Type::object) v.key = key_;
    fill(v);
    const std::size_t index = values_->size() - 1;
    (*values_)[index].end = index + 1;
    if (top) take();
    return true;
  }

  bool open(Value::Type type) {
    if (depth_ >= kDeepest) {
      root("brackets are nested more than " + std::to_string(kDeepest) + " deep",
           "no part of a case is nested so deep", "give the file of a case");
      gave_up_ = true;
      return false;
    }
    ++depth_;
    if (depth_ == 1) {
      root_is_object_ = type == Value::Type::object;
      if (!root_is_object_) {
        root("the document is a list", "must be an object, { \"format\": \"kiloamp-case\", ... }",
             "give the file of a case");
        gave_up_ = true;
      }
      return root_is_object_;
    }
    if (depth_ == 2 && type == Value::Type::array && open_.empty()) {
      if (const auto kind = section_of(key_)) {
        if (see(key_))
          section_ = kind;
        else
          section_.reset();
        skip_section_ = !section_;
        return true;
      }
    }
    if ((depth_ == 3 && section_ && open_.empty()) || (depth_ == 2 && open_.empty())) begin();
    Value& v = values_->add();
    v.type = type;
    v.integer = false;
    if (open_.empty() || (*values_)[open_.back()].type == Value::Type::object) v.key = key_;
    open_.push_back(values_->size() - 1);
    return true;
  }

  bool close() {
    --depth_;
    if (open_.empty()) {  // a section or the document itself
      section_.reset();
      skip_section_ = false;
      return true;
    }
    (*values_)[open_.back()].end = values_->size();
    open_.pop_back();
    if (open_.empty()) take();
    return true;
  }

  static std::optional<ElementKind> section_of(std::string_view name) {
    for (std::size_t k = 0; k < case_file::kSections; ++k)
      if (name == section_name(static_cast<ElementKind>(k))) return static_cast<ElementKind>(k);
    return std::nullopt;
  }

  // A whole element, or a whole field of the document, stands in values_.
  void take() {
    if (skip_section_) return;
    if (section_) {
      const Value& element = (*values_)[0];
      if (element.type == Value::Type::object)
        elements_.push(*section_);
      else
        root(std::string(section_name(*section_)) + " holds " + case_file::shown(element),
             "must hold objects, { ... }", "write each element as an object");
      return;
    }
    const Value& v = root_values_[0];
    if (v.key.rfind("x_", 0) == 0) {
      if (!see(v.key)) return;
      network_.user_fields.push_back({v.key, {}});
      case_file::append_json(network_.user_fields.back().json_text, root_values_, 0);
      return;
    }
    if (std::find(root_fields().begin(), root_fields().end(), v.key) == root_fields().end()) {
      const std::string near = nearest(v.key, root_fields());
      return root(v.key + " is not known here", "must be a section or field of a case, or begin with x_",
                  near.empty() ? "delete it, or let its name begin with x_ to keep it as your own"
                               : "did you mean " + near + "?");
    }
    if (see(v.key)) take_root_field(v);
  }

  // False, with a complaint, when the key was there before.
  bool see(const std::string& name) {
    if (std::find(seen_.begin(), seen_.end(), name) != seen_.end()) {
      root(name + " appears twice", "a key appears once in an object", "join the two, or delete one");
      return false;
    }
    seen_.push_back(name);
    return true;
  }

  void take_root_field(const Value& v) {
    const auto wrong = [&](const char* allowed, const char* remedy) {
      root(v.key + " = " + case_file::shown(v), allowed, remedy);
    };
    const bool number = v.type == Value::Type::number;
    if (v.key == "format") {
      if (v.type != Value::Type::text || v.text != "kiloamp-case")
        wrong("must be \"kiloamp-case\"", "give the file of a case");
    } else if (v.key == "version") {
      if (!number || !v.integer || v.number != 1) wrong("must be 1", "this program reads version 1");
    } else if (v.key == "title") {
      if (v.type == Value::Type::text)
        network_.title = v.text;
      else
        wrong("must be a text", "write the title in quotes");
    } else if (v.key == "frequency_hz") {
      if (number && v.number >= 10 && v.number <= 500)
        network_.frequency_hz = v.number;
      else
        wrong("must be a number from 10 to 500", "usual are 50 and 60");
    } else if (v.key == "base_mva") {
      if (number && v.number > 0)
        network_.base_mva = v.number;
      else
        wrong("must be a number > 0", "100 is usual; no answer in amperes depends on it");
    } else if (v.key == "prefault_pu") {
      if (number && v.number > 0)
        network_.prefault_pu = v.number;
      else
        wrong("must be a number > 0", "1.0 is the nominal voltage");
    } else {
      wrong("must be a list, [ ... ]", "write the section as a list of elements");
    }
  }

  Network& network_;
  Complaints& complaints_;
  ElementQueue& elements_;
  std::string_view text_;
  Values root_values_;
  Values* values_ = &root_values_;  // what is being collected
  std::vector<std::size_t> open_;
  std::string key_;
  std::size_t depth_ = 0;
  std::optional<ElementKind> section_;
  bool skip_section_ = false, root_is_object_ = false, gave_up_ = false;
  std::vector<std::string> seen_;
};

ReadResult failed(const std::string& file, std::string fault, std::string allowed, std::string remedy) {
  ReadResult result;
  result.errors.push_back({file, {}, std::move(fault), std::move(allowed), std::move(remedy)});
  return result;
}

}  // namespace

std::string render(const InputError& e) {
  std::string out = e.file + ": ";
  if (!e.element.empty()) out += e.element + ", ";
  return out + e.fault + "\n  " + e.allowed + "\n  remedy: " + e.remedy + "\n";
}

std::string render(const std::vector<InputError>& errors) {
  std::string out;
  for (std::size_t i = 0; i < errors.size() && i < kMostShown; ++i) out += render(errors[i]);
  if (errors.size() > kMostShown) out += "... and " + std::to_string(errors.size() - kMostShown) + " more\n";
  return out;
}

std::string nearest(std::string_view word, const std::vector<std::string_view>& known) {
  if (word.size() > 128) return {};
  std::string_view best;
  std::size_t best_distance = std::min(word.size(), std::max<std::size_t>(1, word.size() / 3) + 1);
  std::vector<std::size_t> row;
  for (const auto candidate : known) {
    const std::size_t gap =
        candidate.size() > word.size() ? candidate.size() - word.size() : word.size() - candidate.size();
    if (gap >= best_distance) continue;
    row.resize(candidate.size() + 1);
    for (std::size_t j = 0; j <= candidate.size(); ++j) row[j] = j;
    for (std::size_t i = 1; i <= word.size(); ++i) {
      std::size_t diagonal = row[0];
      row[0] = i;
      for (std::size_t j = 1; j <= candidate.size(); ++j) {
        const std::size_t above = row[j];
        row[j] = std::min({above + 1, row[j - 1] + 1, diagonal + (word[i - 1] == candidate[j - 1] ? 0 : 1)});
        diagonal = above;
      }
    }
    if (row.back() < best_distance) {
      best_distance = row.back();
      best = candidate;
    }
  }
  return std::string(best);
}

InputError located(const std::string& file, const Network& network, const Finding& finding) {
  InputError error{file, {}, finding.field, finding.allowed, finding.remedy};
  if (finding.element)
    error.element = case_file::name_of(finding.element->kind, element(network, *finding.element).id,
                                       finding.element->index);
  error.fault += (finding.field.empty() ? "" : ": ") + finding.found;
  return error;
}

namespace {

ReadResult read_text(std::string_view text, const std::string& file) {
  ReadResult result;
  if (text.find_first_not_of(" \t\r\n") == std::string_view::npos)
    return failed(file, "the file is empty", "must be one JSON document", "give the file of a case");
  Network network;
  Complaints complaints(file), of_elements(file);
  ElementReader elements(network, of_elements);
  elements.expect(text.size() / kBytesOfElement);
  ElementQueue queue(elements);
  Receiver receiver(network, complaints, queue, text);
  json::sax_parse(text.begin(), text.end(), &receiver);
  queue.finish();
  complaints.join(of_elements);
  if (!receiver.gave_up()) {
    receiver.finish();
    elements.resolve_references();
    complaints.join(of_elements);
    if (network.buses.empty() && complaints.empty())
      complaints.add(0, {}, "buses is empty", "must be a list of at least one bus", "add the buses");
    for (const Finding& finding : judge(network, [&](ElementRef ref) { return elements.is_bad(ref); })) {
      InputError error = located(file, network, finding);
      if (finding.severity == Severity::remark)
        result.remarks.push_back(std::move(error));
      else
        complaints.add(finding.element ? elements.order_of(*finding.element) : 0, error.element, error.fault,
                       error.allowed, error.remedy);
    }
  }
  result.errors = complaints.take();
  if (result.errors.empty()) result.network = std::move(network);
  return result;
}

// The digest is made when it is asked for: not every report names it.
ReadResult read_owned(std::string text, const std::string& file) {
  const auto kept = std::make_shared<const std::string>(std::move(text));
  ReadResult result = read_text(*kept, file);
  result.sha256 = std::async(std::launch::deferred, [kept] { return sha256(*kept); });
  return result;
}

}  // namespace

ReadResult read_case_text(std::string_view text, const std::string& file) {
  return read_owned(std::string(text), file);
}

ReadResult read_case(const std::filesystem::path& path) {
  const std::string name = path.string();
  std::string text;
  if (name == "-") {
    text.assign(std::istreambuf_iterator<char>(std::cin), {});
    return read_owned(std::move(text), "standard input");
  }
  std::error_code ignored;
  if (std::filesystem::is_directory(path, ignored))
    return failed(name, "is a directory", "must be a file", "name the case file inside it");
  errno = 0;
  std::ifstream in(path, std::ios::binary);
  if (!in) {
    const int reason = errno;
    if (reason == ENOENT)
      return failed(name, "no such file", "must be a case file or - for standard input", "check the path");
    return failed(name, std::string("cannot be read: ") + std::strerror(reason), "must be readable",
                  "check its permissions");
  }
  const auto size = std::filesystem::file_size(path, ignored);
  if (!ignored) text.reserve(size);
  char buffer[1 << 16];
  while (in.read(buffer, sizeof buffer) || in.gcount() > 0)
    text.append(buffer, static_cast<std::size_t>(in.gcount()));
  if (in.bad()) return failed(name, "cannot be read to its end", "must be readable", "check the disk");
  return read_owned(std::move(text), name);
}

}  // namespace kiloamp
