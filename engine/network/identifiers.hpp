// Who is who: strong indices for buses and references to elements. A row of a matrix is never one of these.
#pragma once
#include <compare>
#include <cstdint>
#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace kiloamp {

/// Position of a bus in Network::buses.
enum class BusIndex : std::uint32_t {};
[[nodiscard]] constexpr std::size_t at(BusIndex bus) { return static_cast<std::size_t>(bus); }

/// The sections of a case, in the order in which results list their elements.
enum class ElementKind : std::uint8_t {
  bus,
  network_feeder,
  synchronous_machine,
  induction_motor,
  inverter_source,
  line,
  mutual_coupling,
  transformer,
  three_winding_transformer,
  earthing_transformer,
  series_reactor,
  shunt,
  bus_switch,
  power_station_unit,
  breaker,
  fuse,
  switchboard,
  relay,
  scenario
};

/// Element number `index` (0-based, in file order) of the section `kind`.
struct ElementRef {
  ElementKind kind = ElementKind::bus;
  std::uint32_t index = 0;
  friend auto operator<=>(const ElementRef&, const ElementRef&) = default;
};

/// A user's own field (its name begins with x_), kept as the JSON text it had.
struct UserField {
  std::string name;
  std::string json_text;
};

/// What every element has. An optional is empty when the user did not write it.
struct Element {
  std::string id;
  std::optional<bool> in_service;
  std::optional<std::string> note;
  std::vector<UserField> user_fields;

  [[nodiscard]] bool is_in_service() const { return in_service.value_or(true); }
};

/// How a star point is connected to earth; r_ohm + j x_ohm stand between neutral and earth (never their
/// triple).
enum class Grounding : std::uint8_t { solid, impedance, open };
struct Neutral {
  Grounding grounding = Grounding::open;
  std::optional<double> r_ohm;
  std::optional<double> x_ohm;
};

}  // namespace kiloamp
