// Memory of the program: blocks of megabytes lie on large pages. A big case touches hundreds of megabytes
// once, and a third of its reading was spent on the first touch of small pages.
#include <sys/mman.h>

#include <cstdlib>
#include <new>

namespace {
constexpr std::size_t kLargePage = std::size_t{1} << 21;

void* allocate(std::size_t size) noexcept {
  if (size < kLargePage) return std::malloc(size == 0 ? 1 : size);
  void* block = std::aligned_alloc(kLargePage, (size + kLargePage - 1) / kLargePage * kLargePage);
  if (block != nullptr) ::madvise(block, size, MADV_HUGEPAGE);  // a wish: where it fails, small pages serve
  return block;
}
}  // namespace

void* operator new(std::size_t size) {
  if (void* block = allocate(size)) return block;
  throw std::bad_alloc();
}
void* operator new[](std::size_t size) { return operator new(size); }
void operator delete(void* block) noexcept { std::free(block); }
void operator delete[](void* block) noexcept { std::free(block); }
void operator delete(void* block, std::size_t) noexcept { std::free(block); }
void operator delete[](void* block, std::size_t) noexcept { std::free(block); }
