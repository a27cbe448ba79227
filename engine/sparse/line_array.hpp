// Uninitialised arrays that start at a cache line.
#pragma once
#include <cstddef>
#include <cstdint>
#include <memory>
#include <type_traits>

namespace kiloamp::sparse {

/// `count` values, not set. An entry of four lanes is as long as a cache line: read here and there, one that
/// starts elsewhere costs two. Memory of the ordinary kind, so that the program may choose where it lies.
template <typename T>
class LineArray {
  static_assert(std::is_trivially_default_constructible_v<T> && std::is_trivially_destructible_v<T>);

 public:
  LineArray() = default;
  explicit LineArray(std::size_t count)
      : memory_(std::make_unique_for_overwrite<std::byte[]>(count * sizeof(T) + kLine)) {
    const std::size_t past = reinterpret_cast<std::uintptr_t>(memory_.get()) % kLine;
    first_ = reinterpret_cast<T*>(memory_.get() + (past == 0 ? 0 : kLine - past));
  }

  [[nodiscard]] T* get() const { return first_; }
  T& operator[](std::size_t k) const { return first_[k]; }
  explicit operator bool() const { return first_ != nullptr; }

 private:
  static constexpr std::size_t kLine = 64;
  std::unique_ptr<std::byte[]> memory_;
  T* first_ = nullptr;
};

}  // namespace kiloamp::sparse
