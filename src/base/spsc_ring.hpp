// Ring from one thread to one other, without locks: the loop's way to tell the journal anything.
// A full ring refuses, counts and never waits.
#pragma once

#include <atomic>
#include <bit>
#include <cstddef>
#include <cstdint>
#include <type_traits>
#include <vector>

namespace millpond {

enum class PushOutcome : std::uint8_t {
    stored,      ///< will be read
    dropped_full ///< was counted and forgotten: the reader could not keep up
};

/// Thread: `push` from one, `pop` from one other, the counts from any. After construction allocates nothing.
template <class Value> class SpscRing {
    static_assert(std::is_trivially_copyable_v<Value>);

  public:
    /// Holds at least `capacity` values (rounded up to a power of two). Touches all its memory here.
    explicit SpscRing(std::size_t capacity) : values_(std::bit_ceil(capacity)), mask_(values_.size() - 1) {}

    /// Thread: producer.
    PushOutcome push(const Value& value) noexcept {
        const auto at = written_.load(std::memory_order_relaxed); // only this thread writes it
        if (at - read_as_seen_ > mask_) {
            // Acquire meets pop's release: the slot was copied out before it is written again.
            read_as_seen_ = read_.load(std::memory_order_acquire);
            if (at - read_as_seen_ > mask_) {
                dropped_.fetch_add(1, std::memory_order_relaxed); // a count; orders nothing
                return PushOutcome::dropped_full;
            }
        }
        values_[at & mask_] = value;
        written_.store(at + 1, std::memory_order_release); // publishes the slot to pop's acquire
        return PushOutcome::stored;
    }

    /// False where the ring is empty. Thread: consumer.
    bool pop(Value& value) noexcept {
        const auto at = read_.load(std::memory_order_relaxed); // only this thread writes it
        if (at == written_as_seen_) {
            written_as_seen_ = written_.load(std::memory_order_acquire); // meets push's release: the slot is filled
            if (at == written_as_seen_) {
                return false;
            }
        }
        value = values_[at & mask_];
        read_.store(at + 1, std::memory_order_release); // hands the slot back to push's acquire
        return true;
    }

    /// Values refused since the start.
    [[nodiscard]] std::uint64_t dropped() const noexcept { return dropped_.load(std::memory_order_relaxed); }
    [[nodiscard]] std::size_t capacity() const noexcept { return values_.size(); }

  private:
    // 64 bytes: one cache line on x86-64, so that the two sides do not take each other's line away.
    alignas(64) std::atomic<std::uint64_t> written_{0}; // producer writes, consumer reads
    std::uint64_t read_as_seen_{0};                     // producer only
    std::atomic<std::uint64_t> dropped_{0};             // producer writes, rarely
    alignas(64) std::atomic<std::uint64_t> read_{0};    // consumer writes, producer reads
    std::uint64_t written_as_seen_{0};                  // consumer only
    alignas(64) std::vector<Value> values_;             // constant place and size
    std::uint64_t mask_;
};

} // namespace millpond
