// Who bears an id, over all sections of a network.
#pragma once
#include <string_view>

#include "engine/network/network.hpp"

namespace kiloamp {

/// Open addressing over references; the ids themselves stay in the network, so that a million elements cost
/// 12 bytes each here. Every call takes the network that the references are of.
class IdTable {
 public:
  IdTable() = default;
  /// All elements of a network whose ids are unique.
  explicit IdTable(const Network& network);

  /// Makes room for `elements` at once.
  void reserve(std::size_t elements);
  /// Empty: nobody bears it.
  [[nodiscard]] std::optional<ElementRef> find(const Network& network, std::string_view id) const;
  /// Enters the element under its id. Returns who bears that id already, and then enters nothing.
  std::optional<ElementRef> add(const Network& network, ElementRef ref);
  [[nodiscard]] std::size_t size() const { return used_; }

 private:
  struct Slot {
    std::uint32_t hash = 0;
    ElementRef ref;
    bool used = false;
  };
  [[nodiscard]] std::size_t slot_of(const Network& network, std::string_view id, std::uint32_t hash) const;
  void resize(std::size_t slots);

  std::vector<Slot> slots_;
  std::size_t used_ = 0;
};

}  // namespace kiloamp
