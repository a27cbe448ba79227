// Makes field tables from member pointers.
#pragma once
#include <optional>
#include <type_traits>

#include "io/case_file/field_table.hpp"

namespace kiloamp::case_file {

namespace detail {

template <typename T>
struct Bare {
  using type = T;
  static constexpr bool optional = false;
};
template <typename T>
struct Bare<std::optional<T>> {
  using type = T;
  static constexpr bool optional = true;
};

/// The value of a plain or optional member, or null when it was not given.
template <typename Member>
const typename Bare<Member>::type* given(const Member& member) {
  if constexpr (Bare<Member>::optional)
    return member ? &*member : nullptr;
  else
    return &member;
}

[[nodiscard]] inline std::string id_of(const Network& network, ElementRef ref) {
  return element(network, ref).id;
}

}  // namespace detail

/// Says that a list may have any number of entries.
struct AnyCount {};

/// `E` is the struct that the table describes.
template <typename E>
class TableMaker {
 public:
  explicit TableMaker(ElementKind kind, bool is_element = true) {
    table_.kind = kind;
    table_.is_element = is_element;
  }

  template <auto M>
  TableMaker& number(std::string_view name, Range range, bool required = false,
                     std::string_view remedy = {}) {
    using T = typename detail::Bare<std::remove_reference_t<decltype(std::declval<E>().*M)>>::type;
    Field f = base(name, std::is_same_v<T, int> ? FieldType::integer : FieldType::number, required, remedy);
    f.range = range;
    f.set = [](void* e, const Value& v, std::size_t) { static_cast<E*>(e)->*M = static_cast<T>(v.number); };
    f.write = [](const void* e, const Network&, std::string& out) {
      const auto* value = detail::given(static_cast<const E*>(e)->*M);
      if (value != nullptr) append_number(out, static_cast<double>(*value));
      return value != nullptr;
    };
    return add(f);
  }

  template <auto M>
  TableMaker& boolean(std::string_view name, bool required = false) {
    Field f = base(name, FieldType::boolean, required, {});
    f.set = [](void* e, const Value& v, std::size_t) { static_cast<E*>(e)->*M = v.boolean; };
    f.write = [](const void* e, const Network&, std::string& out) {
      const bool* value = detail::given(static_cast<const E*>(e)->*M);
      if (value != nullptr) out += *value ? "true" : "false";
      return value != nullptr;
    };
    return add(f);
  }

  template <auto M>
  TableMaker& text(std::string_view name) {
    Field f = base(name, FieldType::text, false, {});
    f.set = [](void* e, const Value& v, std::size_t) { static_cast<E*>(e)->*M = v.text; };
    f.write = [](const void* e, const Network&, std::string& out) {
      const std::string* value = detail::given(static_cast<const E*>(e)->*M);
      if (value != nullptr) append_quoted(out, *value);
      return value != nullptr;
    };
    return add(f);
  }

  /// An enumeration whose values 0, 1, ... have the words Words[0], Words[1], ...
  template <auto M, const std::vector<std::string_view>* Words>
  TableMaker& word(std::string_view name, bool required = false) {
    using T = typename detail::Bare<std::remove_reference_t<decltype(std::declval<E>().*M)>>::type;
    Field f = base(name, FieldType::word, required, {});
    f.words = Words;
    f.set = [](void* e, const Value&, std::size_t index) { static_cast<E*>(e)->*M = static_cast<T>(index); };
    f.write = [](const void* e, const Network&, std::string& out) {
      const T* value = detail::given(static_cast<const E*>(e)->*M);
      if (value != nullptr) append_quoted(out, (*Words)[static_cast<std::size_t>(*value)]);
      return value != nullptr;
    };
    return add(f);
  }

  /// A reference stored as BusIndex, as index into its section, or as ElementRef.
  template <auto M>
  TableMaker& reference(std::string_view name, Target target, bool required = true) {
    using Member = std::remove_reference_t<decltype(std::declval<E>().*M)>;
    using T = typename detail::Bare<Member>::type;
    Field f = base(name, FieldType::reference, required, {});
    f.target = target;
    f.set_reference = [](void* e, ElementRef ref) {
      if constexpr (std::is_same_v<T, ElementRef>)
        static_cast<E*>(e)->*M = ref;
      else
        static_cast<E*>(e)->*M = static_cast<T>(ref.index);
    };
    if constexpr (std::is_same_v<T, ElementRef>) {
      f.write = [](const void* e, const Network& n, std::string& out) {
        const T* value = detail::given(static_cast<const E*>(e)->*M);
        if (value != nullptr) append_quoted(out, detail::id_of(n, *value));
        return value != nullptr;
      };
    } else {
      f.write = target == Target::line                  ? &write_index<M, ElementKind::line>
                : target == Target::synchronous_machine ? &write_index<M, ElementKind::synchronous_machine>
                : target == Target::transformer         ? &write_index<M, ElementKind::transformer>
                                                        : &write_index<M, ElementKind::bus>;
    }
    return add(f);
  }

  template <auto M>
  TableMaker& references(std::string_view name, Target target) {
    Field f = base(name, FieldType::reference_list, false, {});
    f.target = target;
    f.set_reference = [](void* e, ElementRef ref) {
      auto& list = static_cast<E*>(e)->*M;
      if constexpr (std::is_same_v<typename std::remove_reference_t<decltype(list)>::value_type, ElementRef>)
        list.push_back(ref);
      else
        list.push_back(ref.index);
    };
    f.write = [](const void* e, const Network& n, std::string& out) {
      const auto& list = static_cast<const E*>(e)->*M;
      if (list.empty()) return false;
      const char* gap = "[";
      for (const auto& item : list) {
        out += gap;
        if constexpr (std::is_same_v<std::remove_cvref_t<decltype(item)>, ElementRef>)
          append_quoted(out, detail::id_of(n, item));
        else
          append_quoted(out, detail::id_of(n, {ElementKind::bus_switch, item}));
        gap = ", ";
      }
      out += ']';
      return true;
    };
    return add(f);
  }

  /// Numbers in an array, in an optional vector or optional std::array<double, 2>.
  template <auto M>
  TableMaker& numbers(std::string_view name, Range range, bool or_number = false) {
    Field f = number_list<M>(name, range);
    f.fixed_count = 2;
    f.or_number = or_number;
    return add(f);
  }
  /// A list of any length.
  template <auto M>
  TableMaker& numbers(std::string_view name, Range range, AnyCount) {
    return add(number_list<M>(name, range));
  }

  template <auto M>
  TableMaker& object(std::string_view name, const Table& inner, bool required = false) {
    using Member = std::remove_reference_t<decltype(std::declval<E>().*M)>;
    Field f = base(name, FieldType::object, required, {});
    f.object = &inner;
    f.make = [](void* e) -> void* {
      auto& member = static_cast<E*>(e)->*M;
      if constexpr (detail::Bare<Member>::optional) {
        member.emplace();
        return &*member;
      } else {
        return &member;
      }
    };
    f.peek = [](const void* e, std::size_t index) -> const void* {
      return index == 0 ? detail::given(static_cast<const E*>(e)->*M) : nullptr;
    };
    return add(f);
  }

  template <auto M>
  TableMaker& objects(std::string_view name, const Table& inner) {
    Field f = base(name, FieldType::object_list, false, {});
    f.object = &inner;
    f.make = [](void* e) -> void* { return &(static_cast<E*>(e)->*M).emplace_back(); };
    f.peek = [](const void* e, std::size_t index) -> const void* {
      const auto& list = static_cast<const E*>(e)->*M;
      return index < list.size() ? &list[index] : nullptr;
    };
    return add(f);
  }

  /// A field with its own way of setting and writing.
  TableMaker& custom(Field f) { return add(f); }

  TableMaker& choice(std::vector<std::vector<std::string_view>> ways, std::string_view remedy,
                     bool required = true) {
    table_.choices.push_back({std::move(ways), required, remedy});
    return *this;
  }

  template <auto Section>
  TableMaker& section() {
    table_.append = [](Network& n) -> void* { return &(n.*Section).emplace_back(); };
    table_.element = [](Network& n, std::size_t i) -> void* { return &(n.*Section)[i]; };
    table_.count = [](const Network& n) { return (n.*Section).size(); };
    return *this;
  }

  Table done() {
    table_.index();
    return std::move(table_);
  }

 private:
  template <auto M, ElementKind K>
  static bool write_index(const void* e, const Network& n, std::string& out) {
    const auto* value = detail::given(static_cast<const E*>(e)->*M);
    if (value != nullptr) append_quoted(out, detail::id_of(n, {K, static_cast<std::uint32_t>(*value)}));
    return value != nullptr;
  }
  template <auto M>
  static Field number_list(std::string_view name, Range range) {
    Field f = base(name, FieldType::number_list, false, {});
    f.range = range;
    f.set = [](void* e, const Value& v, std::size_t index) {
      auto& member = static_cast<E*>(e)->*M;
      if (!member) member.emplace();
      if constexpr (requires { member->push_back(0.0); }) {
        member->push_back(v.number);
      } else {
        (*member)[index] = v.number;
      }
    };
    f.write = [](const void* e, const Network&, std::string& out) {
      const auto& member = static_cast<const E*>(e)->*M;
      if (!member) return false;
      if (member->size() == 1) {
        append_number(out, member->front());
        return true;
      }
      const char* gap = "[";
      for (const double value : *member) {
        out += gap;
        append_number(out, value);
        gap = ", ";
      }
      out += ']';
      return true;
    };
    return f;
  }
  static Field base(std::string_view name, FieldType type, bool required, std::string_view remedy) {
    Field f;
    f.name = name;
    f.type = type;
    f.required = required;
    f.remedy = remedy;
    return f;
  }
  TableMaker& add(const Field& f) {
    table_.fields.push_back(f);
    return *this;
  }

  Table table_;
};

}  // namespace kiloamp::case_file
