#include "engine/network/id_table.hpp"

#include <functional>

namespace kiloamp {

namespace {
constexpr std::size_t kSmallest = 64;  // slots; a power of two, as every size is

std::uint32_t hash_of(std::string_view id) {
  const std::size_t h = std::hash<std::string_view>{}(id);
  return static_cast<std::uint32_t>(h ^ (h >> 32));
}
}  // namespace

IdTable::IdTable(const Network& network) {
  for_each_section(network, [&](ElementKind kind, const auto& section) {
    for (std::uint32_t i = 0; i < section.size(); ++i) add(network, {kind, i});
  });
}

// The slot of `id`, or the free one where it belongs.
std::size_t IdTable::slot_of(const Network& network, std::string_view id, std::uint32_t hash) const {
  const std::size_t mask = slots_.size() - 1;
  std::size_t slot = hash & mask;
  while (slots_[slot].used && (slots_[slot].hash != hash || element(network, slots_[slot].ref).id != id))
    slot = (slot + 1) & mask;
  return slot;
}

std::optional<ElementRef> IdTable::find(const Network& network, std::string_view id) const {
  if (slots_.empty()) return std::nullopt;
  const Slot& slot = slots_[slot_of(network, id, hash_of(id))];
  return slot.used ? std::optional(slot.ref) : std::nullopt;
}

std::optional<ElementRef> IdTable::add(const Network& network, ElementRef ref) {
  if (2 * (used_ + 1) > slots_.size()) resize(slots_.empty() ? kSmallest : 2 * slots_.size());
  const std::string& id = element(network, ref).id;
  const std::uint32_t hash = hash_of(id);
  Slot& slot = slots_[slot_of(network, id, hash)];
  if (slot.used) return slot.ref;
  slot = {hash, ref, true};
  ++used_;
  return std::nullopt;
}

void IdTable::reserve(std::size_t elements) {
  std::size_t slots = kSmallest;
  while (slots < 2 * (elements + 1)) slots *= 2;
  if (slots > slots_.size()) resize(slots);
}

void IdTable::resize(std::size_t slots) {
  std::vector<Slot> old(slots);
  old.swap(slots_);
  const std::size_t mask = slots_.size() - 1;
  for (const Slot& one : old) {
    if (!one.used) continue;
    std::size_t slot = one.hash & mask;
    while (slots_[slot].used) slot = (slot + 1) & mask;
    slots_[slot] = one;
  }
}

}  // namespace kiloamp
