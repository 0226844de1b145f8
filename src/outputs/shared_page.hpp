// Memory that this process and those forked from it see alike. Thread: control.
#pragma once

#include <new>
#include <sys/mman.h>

namespace millpond {

/// A zeroed `Value` of atomics in memory shared with later children; throws std::bad_alloc.
template <class Value> Value* new_shared() {
    void* memory = ::mmap(nullptr, sizeof(Value), PROT_READ | PROT_WRITE, MAP_SHARED | MAP_ANONYMOUS, -1, 0);
    if (memory == MAP_FAILED) {
        throw std::bad_alloc();
    }
    return new (memory) Value{};
}

template <class Value> void delete_shared(Value* value) noexcept {
    ::munmap(value, sizeof(Value));
}

} // namespace millpond
