#include "tests/unit/kinetics/allocation_count_support.hpp"

#include <atomic>
#include <cstdlib>
#include <new>

namespace {

std::atomic<std::size_t> count{0};

void* counted(std::size_t size, std::size_t alignment) {
  ++count;
  const std::size_t whole = (size + alignment - 1) / alignment * alignment;
  void* memory = std::aligned_alloc(alignment, whole == 0 ? alignment : whole);
  if (memory == nullptr) throw std::bad_alloc();
  return memory;
}

}  // namespace

void* operator new(std::size_t size) { return counted(size, alignof(std::max_align_t)); }
void* operator new(std::size_t size, std::align_val_t alignment) {
  return counted(size, static_cast<std::size_t>(alignment));
}
// std::stable_sort asks for its buffer this way and gives it back to the operators below.
void* operator new(std::size_t size, const std::nothrow_t& /*tag*/) noexcept {
  ++count;
  return std::malloc(size == 0 ? 1 : size);  // NOLINT
}
void operator delete(void* memory) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t) noexcept { std::free(memory); }
void operator delete(void* memory, std::align_val_t) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t, std::align_val_t) noexcept { std::free(memory); }

namespace stillzone::kinetics {

std::size_t n_allocations() { return count.load(); }

}  // namespace stillzone::kinetics
