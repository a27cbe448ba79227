#include "io/case_file/schema.hpp"

#include <nlohmann/json.hpp>

#include "io/case_file/field_table.hpp"

namespace kiloamp {

namespace {

using namespace case_file;
using Json = nlohmann::ordered_json;

Json number_schema(Range range, bool integer) {
  Json s{{"type", integer ? "integer" : "number"}};
  switch (range) {
    case Range::any:
      break;
    case Range::positive:
      s["exclusiveMinimum"] = 0;
      break;
    case Range::non_negative:
      s["minimum"] = 0;
      break;
    case Range::not_zero:
      s["not"] = {{"const", 0}};
      break;
    case Range::fraction:
      s["exclusiveMinimum"] = 0;
      s["maximum"] = 1;
      break;
    case Range::percent:
      s["exclusiveMinimum"] = 0;
      s["maximum"] = 100;
      break;
    case Range::integer_from_one:
      s["minimum"] = 1;
      s["maximum"] = 1000000;
      break;
    case Range::plus_minus_one:
      s["enum"] = {1, -1};
      break;
  }
  return s;
}

Json object_schema(const Table& table);

Json field_schema(const Field& field) {
  const Json reference{{"$ref", "#/$defs/id"}};
  switch (field.type) {
    case FieldType::number:
      return number_schema(field.range, false);
    case FieldType::integer:
      return number_schema(field.range, true);
    case FieldType::boolean:
      return {{"type", "boolean"}};
    case FieldType::text:
      if (field.name == "vector_group")
        return {{"type", "string"}, {"pattern", "^(D|YN?|ZN?)((d|yn?|zn?|a)(0|1[01]?|[2-9])?){1,2}$"}};
      return {{"type", "string"}};
    case FieldType::word: {
      Json words = Json::array();
      for (const auto word : *field.words) words.push_back(std::string(word));
      return {{"enum", words}};
    }
    case FieldType::reference:
      return reference;
    case FieldType::object:
      return object_schema(*field.object);
    case FieldType::object_list:
      return {{"type", "array"}, {"items", object_schema(*field.object)}};
    case FieldType::reference_list:
      return {{"type", "array"}, {"items", reference}};
    case FieldType::number_list: {
      Json list{{"type", "array"}, {"items", number_schema(field.range, false)}};
      if (field.fixed_count > 0)
        list.update({{"minItems", field.fixed_count}, {"maxItems", field.fixed_count}});
      return field.or_number ? Json{{"oneOf", {number_schema(field.range, false), list}}} : list;
    }
  }
  return {};
}

// Exactly one way: its fields are there and those of the other ways are not.
Json choice_schema(const Choice& choice) {
  const auto all = [&] {
    std::vector<std::string> names;
    for (const auto& way : choice.ways)
      for (const auto name : way)
        if (std::find(names.begin(), names.end(), name) == names.end()) names.emplace_back(name);
    return names;
  }();
  Json options = Json::array();
  const auto add = [&](const std::vector<std::string_view>& way) {
    Json required = Json::array(), forbidden = Json::array();
    for (const auto& name : all) {
      if (std::find(way.begin(), way.end(), name) != way.end())
        required.push_back(name);
      else
        forbidden.push_back({{"required", {name}}});
    }
    Json option = Json::object();
    if (!required.empty()) option["required"] = required;
    if (!forbidden.empty()) option["not"] = {{"anyOf", forbidden}};
    options.push_back(option);
  };
  for (const auto& way : choice.ways) add(way);
  if (!choice.required) add({});
  return {{"oneOf", options}};
}

Json object_schema(const Table& table) {
  Json properties = Json::object(), required = Json::array();
  if (table.is_element) {
    properties["id"] = {{"$ref", "#/$defs/id"}};
    required.push_back("id");
  }
  for (const Field& field : table.fields) {
    properties[std::string(field.name)] = field_schema(field);
    if (field.required) required.push_back(std::string(field.name));
  }
  Json s{{"type", "object"}};
  if (table.is_element) {
    properties["in_service"] = {{"type", "boolean"}};
    properties["note"] = {{"type", "string"}};
    s["patternProperties"] = {{"^x_", Json::object()}};
  }
  s["properties"] = properties;
  if (!required.empty()) s["required"] = required;
  s["additionalProperties"] = false;
  Json choices = Json::array();
  for (const Choice& choice : table.choices) choices.push_back(choice_schema(choice));
  if (!choices.empty()) s["allOf"] = choices;
  return s;
}

}  // namespace

std::string case_schema() {
  Json properties{{"format", {{"const", "kiloamp-case"}}},
                  {"version", {{"const", 1}}},
                  {"title", {{"type", "string"}}},
                  {"frequency_hz", {{"type", "number"}, {"minimum", 10}, {"maximum", 500}}},
                  {"base_mva", {{"type", "number"}, {"exclusiveMinimum", 0}}},
                  {"prefault_pu", {{"type", "number"}, {"exclusiveMinimum", 0}}}};
  for (std::size_t k = 0; k < kSections; ++k) {
    const auto kind = static_cast<ElementKind>(k);
    Json list{{"type", "array"}, {"items", object_schema(table(kind))}};
    if (kind == ElementKind::bus) list["minItems"] = 1;
    properties[section_name(kind)] = list;
  }
  const Json schema{{"$schema", "https://json-schema.org/draft/2020-12/schema"},
                    {"title", "kiloamp case"},
                    {"description",
                     "One network for short-circuit studies. Names end in their unit; percentages are on the "
                     "element's own rating; voltages are line to line, rms."},
                    {"type", "object"},
                    {"properties", properties},
                    {"required", {"format", "version", "frequency_hz", "buses"}},
                    {"patternProperties", {{"^x_", Json::object()}}},
                    {"additionalProperties", false},
                    {"$defs",
                     {{"id",
                       {{"type", "string"},
                        {"minLength", 1},
                        {"maxLength", 64},
                        {"pattern", "^[^\\u0000-\\u001f\\u007f]*$"}}}}}};
  return schema.dump(1) + "\n";
}

}  // namespace kiloamp
