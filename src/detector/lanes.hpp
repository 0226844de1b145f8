// Arrays as the kernel wants them. Thread: control makes them. Private to this room.
#pragma once

#include <cstdlib>
#include <memory>
#include <new>

namespace millpond {

/// Zeroed memory on a cache line's boundary, as the kernel wants it.
template <class Value> class Lanes {
  public:
    Lanes() = default;
    explicit Lanes(std::size_t count)
        : count_(count), values_(static_cast<Value*>(std::aligned_alloc(64, (count * sizeof(Value) + 63) / 64 * 64))) {
        if (!values_) {
            throw std::bad_alloc();
        }
        fill(Value{});
    }
    void fill(Value value) noexcept {
        for (std::size_t i = 0; i < count_; ++i) {
            values_.get()[i] = value;
        }
    }
    [[nodiscard]] Value* data() const noexcept { return values_.get(); }
    Value& operator[](std::size_t i) const noexcept { return values_.get()[i]; }
    [[nodiscard]] std::size_t size() const noexcept { return count_; }

  private:
    struct Free {
        void operator()(Value* values) const noexcept { std::free(values); }
    };
    std::size_t count_ = 0;
    std::unique_ptr<Value, Free> values_;
};

} // namespace millpond
