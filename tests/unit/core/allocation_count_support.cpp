#include "tests/unit/core/allocation_count_support.hpp"

#include <atomic>
#include <cstdlib>
#include <new>

namespace {
// the counter of this test program: operator new has no other place for it
std::atomic<long> n_allocations = 0;  // NOLINT(cppcoreguidelines-avoid-non-const-global-variables)
}  // namespace

void* operator new(std::size_t size) {
  ++n_allocations;
  if (void* memory = std::malloc(size == 0 ? 1 : size)) return memory;  // NOLINT
  throw std::bad_alloc();
}
// std::stable_sort asks for its buffer this way and gives it back to the operators below.
void* operator new(std::size_t size, const std::nothrow_t& /*tag*/) noexcept {
  ++n_allocations;
  return std::malloc(size == 0 ? 1 : size);  // NOLINT
}
void operator delete(void* memory) noexcept { std::free(memory); }               // NOLINT
void operator delete(void* memory, std::size_t) noexcept { std::free(memory); }  // NOLINT

namespace stillzone::test {

long allocation_count() { return n_allocations; }

}  // namespace stillzone::test
