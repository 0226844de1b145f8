// Ring of sample blocks from the loop to the journal: floats in one ring, where each block begins in another.
#pragma once

#include "base/frames.hpp"
#include "base/spsc_ring.hpp"

#include <algorithm>
#include <vector>

namespace millpond {

/// Thread: `push` from the loop, `pop` from the journal, `dropped_frames` from any. Blocks and allocates: never in
/// `push`.
class SampleRing {
  public:
    /// Holds at least `values` floats in at most `blocks` blocks.
    SampleRing(std::size_t values, std::size_t blocks)
        : values_(std::bit_ceil(values)), mask_(values_.size() - 1), heads_(blocks) {}

    /// Stores the whole block or nothing of it.
    PushOutcome push(const FrameBlock& block) noexcept {
        const auto size = block.data.size();
        // Acquire meets pop's release: the floats were copied out before they are written again.
        const auto used = written_ - read_.load(std::memory_order_acquire);
        if (used + size > values_.size()) {
            return drop(block);
        }
        const auto start = static_cast<std::size_t>(written_ & mask_);
        const auto upto_end = std::min(size, values_.size() - start);
        std::copy_n(block.data.data(), upto_end, values_.data() + start);
        std::copy_n(block.data.data() + upto_end, size - upto_end, values_.data());
        // The head's release publishes the floats too.
        if (heads_.push({block.first, block.channels, size}) != PushOutcome::stored) {
            return drop(block);
        }
        written_ += size;
        return PushOutcome::stored;
    }

    /// Replaces `data` by the oldest block's floats; false where there is none. Thread: journal.
    bool pop(SampleIndex& first, std::vector<float>& data) {
        Head head{};
        if (!heads_.pop(head)) {
            return false;
        }
        first = head.first;
        data.resize(head.size);
        const auto at = read_.load(std::memory_order_relaxed); // only this thread writes it
        const auto start = static_cast<std::size_t>(at & mask_);
        const auto upto_end = std::min(head.size, values_.size() - start);
        std::copy_n(values_.data() + start, upto_end, data.data());
        std::copy_n(values_.data(), head.size - upto_end, data.data() + upto_end);
        read_.store(at + head.size, std::memory_order_release); // hands the floats back to push's acquire
        return true;
    }

    [[nodiscard]] std::uint64_t dropped_frames() const noexcept {
        return dropped_frames_.load(std::memory_order_acquire); // meets drop: the place is there too
    }
    /// Place of the first frame that was ever refused; meaningful once `dropped_frames` is above 0.
    [[nodiscard]] SampleIndex first_dropped() const noexcept {
        return SampleIndex{first_dropped_.load(std::memory_order_relaxed)};
    }

  private:
    struct Head {
        SampleIndex first;
        std::size_t channels;
        std::size_t size;
    };

    PushOutcome drop(const FrameBlock& block) noexcept {
        if (dropped_frames_.load(std::memory_order_relaxed) == 0) {
            first_dropped_.store(block.first.value, std::memory_order_relaxed);
        }
        // Release: whoever sees the count with acquire sees the place as well; readers are in no hurry.
        dropped_frames_.fetch_add(block.frames(), std::memory_order_release);
        return PushOutcome::dropped_full;
    }

    alignas(64) std::uint64_t written_{0};           // producer only; consumers learn it from the heads
    std::atomic<std::uint64_t> dropped_frames_{0};   // producer writes, rarely
    std::atomic<std::uint64_t> first_dropped_{0};    // producer writes, once
    alignas(64) std::atomic<std::uint64_t> read_{0}; // consumer writes, producer reads
    alignas(64) std::vector<float> values_;          // constant place and size
    std::uint64_t mask_;
    SpscRing<Head> heads_;
};

} // namespace millpond
