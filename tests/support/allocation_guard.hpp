// Counts what the current thread allocates. Include in one file of a test program: it replaces operator new.
#pragma once

#include <cstdint>
#include <cstdlib>
#include <new>

namespace millpond::test {

inline thread_local std::uint64_t allocations_of_thread = 0;

class AllocationGuard {
  public:
    /// Allocations of this thread since this guard was made.
    [[nodiscard]] std::uint64_t allocations() const noexcept { return allocations_of_thread - before_; }

  private:
    std::uint64_t before_ = allocations_of_thread;
};

} // namespace millpond::test

// Replacing the global operator is the one way to see every allocation, the standard library's included.
[[gnu::noinline]] void* operator new(std::size_t size) {
    ++millpond::test::allocations_of_thread;
    if (void* memory = std::malloc(size == 0 ? 1 : size)) {
        return memory;
    }
    throw std::bad_alloc();
}
// As well: the standard library asks in this way for room that it can do without.
[[gnu::noinline]] void* operator new(std::size_t size, const std::nothrow_t& /*nothrow*/) noexcept {
    ++millpond::test::allocations_of_thread;
    return std::malloc(size == 0 ? 1 : size);
}
[[gnu::noinline]] void operator delete(void* memory) noexcept {
    std::free(memory);
}
[[gnu::noinline]] void operator delete(void* memory, std::size_t /*size*/) noexcept {
    std::free(memory);
}
