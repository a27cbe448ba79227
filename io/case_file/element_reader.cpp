#include "io/case_file/element_reader.hpp"

#include <algorithm>

namespace kiloamp::case_file {

namespace {

constexpr std::size_t kMaxIdLength = 64;
constexpr std::size_t kMostIdsToCompare = 20000;

std::string in_quotes(std::string_view text) {
  std::string out;
  append_quoted(out, text);
  return out;
}

std::string joined(const std::vector<std::string_view>& words, const char* last) {
  std::string out;
  for (std::size_t i = 0; i < words.size(); ++i) {
    if (i > 0) out += i + 1 == words.size() ? last : ", ";
    out += words[i];
  }
  return out;
}

std::size_t characters(std::string_view utf8) {
  return static_cast<std::size_t>(std::count_if(
      utf8.begin(), utf8.end(), [](char c) { return (static_cast<unsigned char>(c) & 0xC0U) != 0x80U; }));
}

bool printable(std::string_view text) {
  return std::none_of(text.begin(), text.end(),
                      [](char c) { return static_cast<unsigned char>(c) < 0x20 || c == 0x7F; });
}

const char* type_text(const Field& field) {
  switch (field.type) {
    case FieldType::number:
      return "must be a number";
    case FieldType::integer:
      return "must be a whole number";
    case FieldType::boolean:
      return "must be true or false";
    case FieldType::text:
      return "must be a text";
    case FieldType::word:
      return "must be a text";
    case FieldType::reference:
      return "must be the id of an element, a text";
    case FieldType::object:
      return "must be an object, { ... }";
    case FieldType::object_list:
      return "must be a list of objects, [{ ... }, ...]";
    case FieldType::reference_list:
      return "must be a list of ids, [\"...\", ...]";
    case FieldType::number_list:
      return field.or_number ? "must be a number or a list of two numbers" : "must be a list of two numbers";
  }
  return "";
}

bool type_fits(const Field& field, const Value& v) {
  using T = Value::Type;
  switch (field.type) {
    case FieldType::number:
    case FieldType::integer:
      return v.type == T::number;
    case FieldType::boolean:
      return v.type == T::boolean;
    case FieldType::text:
    case FieldType::word:
    case FieldType::reference:
      return v.type == T::text;
    case FieldType::object:
      return v.type == T::object;
    case FieldType::object_list:
    case FieldType::reference_list:
      return v.type == T::array;
    case FieldType::number_list:
      return v.type == T::array || (field.or_number && v.type == T::number);
  }
  return false;
}

}  // namespace

struct ElementReader::Scope {
  ElementRef ref;
  std::size_t order;
  std::string_view id;
  void* storage;       // of the element or of the object inside it
  std::string prefix;  // "max." inside an object
};

void Complaints::add(std::size_t order, std::string element, std::string fault, std::string allowed,
                     std::string remedy) {
  errors_.push_back(
      {order, {file_, std::move(element), std::move(fault), std::move(allowed), std::move(remedy)}});
}

void Complaints::join(Complaints& other) {
  errors_.insert(errors_.end(), std::make_move_iterator(other.errors_.begin()),
                 std::make_move_iterator(other.errors_.end()));
  other.errors_.clear();
}

std::vector<InputError> Complaints::take() {
  std::stable_sort(errors_.begin(), errors_.end(),
                   [](const Placed& a, const Placed& b) { return a.order < b.order; });
  std::vector<InputError> sorted;
  sorted.reserve(errors_.size());
  for (Placed& placed : errors_) sorted.push_back(std::move(placed.error));
  errors_.clear();
  return sorted;
}

std::string name_of(ElementKind kind, std::string_view id, std::size_t index) {
  std::string name = kind_name(kind);
  if (!id.empty()) name += " " + in_quotes(id);
  return name + " (/" + section_name(kind) + "/" + std::to_string(index) + ")";
}

std::string shown(const Value& value) {
  switch (value.type) {
    case Value::Type::null:
      return "null";
    case Value::Type::boolean:
      return value.boolean ? "true" : "false";
    case Value::Type::number: {
      if (!value.text.empty()) return value.text;
      std::string out;
      append_number(out, value.number);
      return out;
    }
    case Value::Type::text: {
      if (value.text.size() <= 80) return in_quotes(value.text);
      std::size_t cut = 77;
      while (cut > 0 && (static_cast<unsigned char>(value.text[cut]) & 0xC0U) == 0x80U) --cut;
      return in_quotes(value.text.substr(0, cut) + "...");
    }
    case Value::Type::object:
      return "{ ... }";
    case Value::Type::array:
      return "[ ... ]";
  }
  return "";
}

void append_json(std::string& out, const Values& values, std::size_t at) {
  const Value& v = values[at];
  const bool object = v.type == Value::Type::object;
  if (object || v.type == Value::Type::array) {
    out += object ? '{' : '[';
    for (std::size_t i = at + 1; i < v.end; i = std::max(i + 1, values[i].end)) {
      if (i > at + 1) out += ", ";
      if (object) {
        append_quoted(out, values[i].key);
        out += ": ";
      }
      append_json(out, values, i);
    }
    out += object ? '}' : ']';
  } else if (v.type == Value::Type::text) {
    append_quoted(out, v.text);
  } else {
    out += shown(v);
  }
}

void ElementReader::complain(const Scope& scope, std::string fault, std::string allowed,
                             std::string_view remedy) {
  bad_.insert(scope.ref);
  complaints_.add(scope.order, name_of(scope.ref.kind, scope.id, scope.ref.index), std::move(fault),
                  std::move(allowed), std::string(remedy));
}

bool ElementReader::is_bad(ElementRef ref) const { return bad_.count(ref) != 0; }

void ElementReader::take_id(const Values& values, const Scope& scope) {
  const Value* given = nullptr;
  for (std::size_t i = 1; i < values[0].end; i = std::max(i + 1, values[i].end))
    if (values[i].key == "id" && given == nullptr) given = &values[i];
  if (given == nullptr)
    return complain(scope, "id is missing", "every element has an id, unique in the file",
                    "give the element a name of its own");
  if (given->type != Value::Type::text)
    return complain(scope, "id = " + shown(*given), "must be a text", "write the id in quotes");
  if (given->text.empty() || characters(given->text) > kMaxIdLength || !printable(given->text))
    return complain(scope, "id = " + shown(*given), "must be 1 to 64 printable characters",
                    "choose a shorter, printable name");
  if (const auto first = ids_.add(network_, scope.ref))
    complain(scope,
             "id = " + in_quotes(given->text) + " is taken by " + name_of(first->kind, {}, first->index),
             "must be unique over the whole file", "rename one of the two and what refers to it");
}

void ElementReader::read(ElementKind kind, const Values& values) {
  const Table& t = table(kind);
  const std::size_t index = t.count(network_);
  if (index == 0) first_order_[static_cast<std::size_t>(kind)] = order_;
  void* storage = t.append(network_);
  Element& common = element(network_, {kind, static_cast<std::uint32_t>(index)});
  Scope scope{{kind, static_cast<std::uint32_t>(index)}, order_++, {}, storage, {}};
  for (std::size_t i = 1; i < values[0].end; i = std::max(i + 1, values[i].end))
    if (values[i].key == "id" && values[i].type == Value::Type::text) common.id = values[i].text;
  scope.id = common.id;
  take_id(values, scope);
  read_object(t, values, 0, scope);
}

void ElementReader::read_object(const Table& t, const Values& values, std::size_t at, const Scope& scope) {
  std::vector<const Field*> present;
  present.reserve(16);
  std::vector<std::string_view> common_seen;
  for (std::size_t i = at + 1; i < values[at].end; i = std::max(i + 1, values[i].end)) {
    const Value& v = values[i];
    if (const Field* field = t.find(v.key)) {
      if (std::find(present.begin(), present.end(), field) != present.end()) {
        complain(scope, scope.prefix + v.key + " appears twice", "a key appears once in an object",
                 "delete one of the two");
        continue;
      }
      present.push_back(field);
      read_field(*field, values, i, scope);
      continue;
    }
    const bool common = t.is_element && (v.key == "id" || v.key == "in_service" || v.key == "note" ||
                                         v.key.rfind("x_", 0) == 0);
    if (common) {
      if (std::find(common_seen.begin(), common_seen.end(), v.key) != common_seen.end())
        complain(scope, scope.prefix + v.key + " appears twice", "a key appears once in an object",
                 "delete one of the two");
      common_seen.push_back(v.key);
      read_common(values, i, scope);
      continue;
    }
    std::vector<std::string_view> known;
    if (t.is_element) known = {"id", "in_service", "note"};
    for (const Field& field : t.fields) known.push_back(field.name);
    const std::string near = nearest(v.key, known);
    complain(scope, scope.prefix + v.key + " is not known here",
             "must be a field of this element, or begin with x_",
             near.empty() ? "delete it, or let its name begin with x_ to keep it as your own"
                          : "did you mean " + near + "?");
  }
  for (const Field& field : t.fields)
    if (field.required && std::find(present.begin(), present.end(), &field) == present.end())
      complain(scope, scope.prefix + std::string(field.name) + " is missing", "must be given",
               field.remedy.empty() ? std::string_view("add it") : field.remedy);
  check_choices(t, present, scope);
}

void ElementReader::check_choices(const Table& t, const std::vector<const Field*>& present,
                                  const Scope& scope) {
  const auto has = [&](std::string_view name) {
    return std::any_of(present.begin(), present.end(), [&](const Field* f) { return f->name == name; });
  };
  for (const Choice& choice : t.choices) {
    std::vector<std::string_view> given;
    std::size_t complete = 0;
    for (const auto& way : choice.ways) {
      std::size_t found = 0;
      for (const auto name : way)
        if (has(name)) {
          ++found;
          if (std::find(given.begin(), given.end(), name) == given.end()) given.push_back(name);
        }
      if (found == way.size()) ++complete;
    }
    // Exactly one way is complete and nothing besides it is given.
    bool fits = given.empty() && !choice.required;
    for (const auto& way : choice.ways)
      fits = fits || (complete == 1 && given.size() == way.size() &&
                      std::all_of(way.begin(), way.end(), [&](auto name) { return has(name); }));
    if (fits) continue;
    std::string allowed =
        choice.required ? "must be given in exactly one way: " : "may be given in at most one way: ";
    for (std::size_t w = 0; w < choice.ways.size(); ++w) {
      if (w > 0) allowed += w + 1 == choice.ways.size() ? " or " : ", ";
      allowed += joined(choice.ways[w], " with ");
    }
    std::string fault;
    if (given.empty()) {
      for (std::size_t w = 0; w < choice.ways.size(); ++w)
        fault += (w == 0                        ? ""
                  : w + 1 == choice.ways.size() ? " and "
                                                : ", ") +
                 scope.prefix + std::string(choice.ways[w].front());
      fault += choice.ways.size() == 1 ? " is missing" : " are missing";
    } else {
      for (std::size_t g = 0; g < given.size(); ++g)
        fault += (g == 0                  ? ""
                  : g + 1 == given.size() ? " and "
                                          : ", ") +
                 scope.prefix + std::string(given[g]);
      fault += given.size() == 1 ? " stands alone" : " stand together";
    }
    complain(scope, fault, allowed, choice.remedy);
  }
}

void ElementReader::read_common(const Values& values, std::size_t at, const Scope& scope) {
  const Value& v = values[at];
  Element& common = element(network_, scope.ref);
  if (v.key == "id") return;
  if (v.key == "in_service") {
    if (v.type == Value::Type::boolean)
      common.in_service = v.boolean;
    else
      complain(scope, "in_service = " + shown(v), "must be true or false",
               "write true or false without quotes");
  } else if (v.key == "note") {
    if (v.type == Value::Type::text)
      common.note = v.text;
    else
      complain(scope, "note = " + shown(v), "must be a text", "write the note in quotes");
  } else {
    common.user_fields.push_back({v.key, {}});
    append_json(common.user_fields.back().json_text, values, at);
  }
}

void ElementReader::read_field(const Field& field, const Values& values, std::size_t at, const Scope& scope) {
  const Value& v = values[at];
  const std::string name = scope.prefix + std::string(field.name);
  if (!type_fits(field, v))
    return complain(scope, name + " = " + shown(v), type_text(field),
                    v.type == Value::Type::null ? "leave the field out when it has no value"
                                                : "correct the type of the value");
  const std::string_view remedy = field.remedy.empty()
                                      ? std::string_view("correct the value; its unit is the end of its name")
                                      : field.remedy;
  switch (field.type) {
    case FieldType::integer:
      if (!v.integer)
        return complain(scope, name + " = " + shown(v), type_text(field), "write it without a fraction");
      [[fallthrough]];
    case FieldType::number:
      if (!in_range(field.range, v.number))
        return complain(scope, name + " = " + shown(v), range_text(field.range), remedy);
      field.set(scope.storage, v, 0);
      return;
    case FieldType::boolean:
    case FieldType::text:
      field.set(scope.storage, v, 0);
      return;
    case FieldType::word: {
      const auto found = std::find(field.words->begin(), field.words->end(), v.text);
      if (found == field.words->end()) {
        const std::string near = nearest(v.text, *field.words);
        return complain(scope, name + " = " + shown(v), "must be " + joined(*field.words, " or "),
                        near.empty() ? "choose one of them" : "did you mean " + near + "?");
      }
      field.set(scope.storage, v, static_cast<std::size_t>(found - field.words->begin()));
      return;
    }
    case FieldType::reference:
      take_reference(field, v.text, scope);
      return;
    case FieldType::object: {
      Scope inner{scope.ref, scope.order, scope.id, field.make(scope.storage), name + "."};
      read_object(*field.object, values, at, inner);
      return;
    }
    default:
      read_list(field, values, at, scope);
  }
}

void ElementReader::read_list(const Field& field, const Values& values, std::size_t at, const Scope& scope) {
  const Value& v = values[at];
  const std::string name = scope.prefix + std::string(field.name);
  if (field.type == FieldType::number_list && v.type == Value::Type::number) {
    if (!in_range(field.range, v.number))
      return complain(scope, name + " = " + shown(v), range_text(field.range), "correct the value");
    field.set(scope.storage, v, 0);
    return;
  }
  std::size_t index = 0;
  for (std::size_t i = at + 1; i < v.end; i = std::max(i + 1, values[i].end), ++index) {
    const Value& item = values[i];
    const std::string item_name = name + "[" + std::to_string(index) + "]";
    if (field.type == FieldType::object_list) {
      if (item.type != Value::Type::object) {
        complain(scope, item_name + " = " + shown(item), "must be an object, { ... }",
                 "correct the type of the value");
        continue;
      }
      Scope inner{scope.ref, scope.order, scope.id, field.make(scope.storage), item_name + "."};
      read_object(*field.object, values, i, inner);
    } else if (field.type == FieldType::reference_list) {
      if (item.type != Value::Type::text)
        complain(scope, item_name + " = " + shown(item), "must be the id of an element, a text",
                 "write the id in quotes");
      else
        take_reference(field, item.text, scope);
    } else if (item.type != Value::Type::number || !in_range(field.range, item.number)) {
      complain(scope, item_name + " = " + shown(item),
               item.type == Value::Type::number ? range_text(field.range) : "must be a number",
               "correct the value");
    } else if (field.fixed_count == 0 || index < field.fixed_count) {
      field.set(scope.storage, item, index);
    }
  }
  if (field.type == FieldType::number_list && field.fixed_count > 0 && index != field.fixed_count)
    complain(scope, name + " has " + std::to_string(index) + " numbers", type_text(field),
             "give exactly two");
}

void ElementReader::take_reference(const Field& field, const std::string& id, const Scope& scope) {
  const auto found = ids_.find(network_, id);
  // Lists wait for the end so that their order stays that of the file.
  if (field.type == FieldType::reference && found && fits(field.target, found->kind))
    field.set_reference(scope.storage, *found);
  else
    pending_.push_back({scope.ref, scope.order, &field, id});
}

void ElementReader::resolve_references() {
  for (const Pending& p : pending_) {
    const Scope scope{p.owner,
                      p.order,
                      element(network_, p.owner).id,
                      table(p.owner.kind).element(network_, p.owner.index),
                      {}};
    const auto found = ids_.find(network_, p.id);
    if (found && fits(p.field->target, found->kind)) {
      p.field->set_reference(scope.storage, *found);
      continue;
    }
    const std::string fault = std::string(p.field->name) + " = " + in_quotes(p.id);
    const std::string allowed =
        std::string("must be the id of ") + target_text(p.field->target) + " of this case";
    if (found) {
      complain(scope, fault + " is " + name_of(found->kind, {}, found->index), allowed,
               "refer to an element of the right kind");
      continue;
    }
    std::string near;
    if (ids_.size() <= kMostIdsToCompare) {
      std::vector<std::string_view> known;
      for_each_section(network_, [&](ElementKind kind, const auto& section) {
        if (!fits(p.field->target, kind)) return;
        for (const auto& e : section) known.push_back(e.id);
      });
      std::sort(known.begin(), known.end());
      near = nearest(p.id, known);
    }
    complain(scope, fault, allowed,
             near.empty() ? "add the element, or correct the id" : "did you mean " + in_quotes(near) + "?");
  }
  pending_.clear();
}

}  // namespace kiloamp::case_file
