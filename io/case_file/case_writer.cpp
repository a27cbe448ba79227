#include "io/case_file/case_writer.hpp"

#include "io/case_file/field_table.hpp"

namespace kiloamp {

namespace {

using namespace case_file;

void append_key(std::string& out, bool& first, std::string_view name) {
  if (!first) out += ", ";
  first = false;
  append_quoted(out, name);
  out += ": ";
}

void append_fields(std::string& out, bool& first, const Table& table, const void* storage,
                   const Network& network) {
  for (const Field& field : table.fields) {
    if (field.peek == nullptr) {
      std::string value;
      if (!field.write(storage, network, value)) continue;
      append_key(out, first, field.name);
      out += value;
      continue;
    }
    if (field.peek(storage, 0) == nullptr) continue;
    append_key(out, first, field.name);
    const bool list = field.type == FieldType::object_list;
    if (list) out += '[';
    for (std::size_t i = 0; const void* item = field.peek(storage, i); ++i) {
      out += i == 0 ? "{" : ", {";
      bool first_inside = true;
      append_fields(out, first_inside, *field.object, item, network);
      out += '}';
    }
    if (list) out += ']';
  }
}

template <typename E>
void append_element(std::string& out, const Table& table, const E& e, const Network& network) {
  out += "    {";
  bool first = true;
  append_key(out, first, "id");
  append_quoted(out, e.id);
  append_fields(out, first, table, &e, network);
  if (e.in_service) {
    append_key(out, first, "in_service");
    out += *e.in_service ? "true" : "false";
  }
  if (e.note) {
    append_key(out, first, "note");
    append_quoted(out, *e.note);
  }
  for (const UserField& user : e.user_fields) {
    append_key(out, first, user.name);
    out += user.json_text;
  }
  out += '}';
}

}  // namespace

std::string write_case(const Network& network) {
  std::string out = "{\n  \"format\": \"kiloamp-case\", \"version\": 1";
  const auto field = [&](const char* name) {
    out += ", ";
    append_quoted(out, name);
    out += ": ";
  };
  if (network.title) {
    field("title");
    append_quoted(out, *network.title);
  }
  field("frequency_hz");
  append_number(out, network.frequency_hz);
  if (network.base_mva) {
    field("base_mva");
    append_number(out, *network.base_mva);
  }
  if (network.prefault_pu) {
    field("prefault_pu");
    append_number(out, *network.prefault_pu);
  }
  for (const UserField& user : network.user_fields) {
    field(user.name.c_str());
    out += user.json_text;
  }
  for_each_section(network, [&](ElementKind kind, const auto& section) {
    if (section.empty()) return;
    out += ",\n  \"" + std::string(section_name(kind)) + "\": [\n";
    for (std::size_t i = 0; i < section.size(); ++i) {
      append_element(out, table(kind), section[i], network);
      out += i + 1 < section.size() ? ",\n" : "]";
    }
  });
  return out + "\n}\n";
}

}  // namespace kiloamp
