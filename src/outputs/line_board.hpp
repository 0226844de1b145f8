// What the session's program and its watchdog process both see of the lines: a page that they share.
#pragma once

#include "base/clock.hpp"
#include "outputs/output_settings.hpp"

#include <array>
#include <atomic>
#include <cstdint>

namespace millpond {

class LineBoard {
  public:
    /// Throws std::bad_alloc where there is no memory. Thread: control.
    LineBoard();
    ~LineBoard();
    LineBoard(const LineBoard&) = delete;
    LineBoard& operator=(const LineBoard&) = delete;

    /// Call before the order to rise, so that no line is high unnoticed. Thread: loop, pulse.
    void rises(std::size_t line) noexcept {
        // Released: the watchdog that sees the time may lower the line at any moment from here.
        shared_->high_since_ns[line].store(monotonic_now().count(), std::memory_order_release);
    }
    /// Call after the order to fall. Thread: any.
    void fell(std::size_t line) noexcept { shared_->high_since_ns[line].store(0, std::memory_order_release); }

    /// 0 while it is low. Thread: watchdog.
    [[nodiscard]] std::int64_t high_since_ns(std::size_t line) const noexcept {
        return shared_->high_since_ns[line].load(std::memory_order_acquire);
    }
    /// The line had been high since `since_ns`, for too long, and was ordered low. Thread: watchdog.
    void lowered(std::size_t line, std::int64_t since_ns) noexcept {
        // Counted before the line reads as low; a rise in between keeps its own time.
        shared_->held.fetch_add(1, std::memory_order_release);
        shared_->high_since_ns[line].compare_exchange_strong(since_ns, 0, std::memory_order_acq_rel);
    }
    /// Lines lowered by the watchdog so far. Thread: any.
    [[nodiscard]] std::uint32_t held() const noexcept { return shared_->held.load(std::memory_order_acquire); }

    /// The watchdog lives. Thread: watchdog.
    void beat() noexcept { shared_->beats.fetch_add(1, std::memory_order_relaxed); } // alone; orders nothing
    [[nodiscard]] std::uint32_t beats() const noexcept { return shared_->beats.load(std::memory_order_relaxed); }

  private:
    struct Shared {
        std::array<std::atomic<std::int64_t>, most_outputs> high_since_ns;
        std::atomic<std::uint32_t> held;
        std::atomic<std::uint32_t> beats;
    };
    // Between two processes only what needs no lock of this process's own works.
    static_assert(std::atomic<std::int64_t>::is_always_lock_free && std::atomic<std::uint32_t>::is_always_lock_free);

    Shared* shared_;
};

} // namespace millpond
