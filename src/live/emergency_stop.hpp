// The emergency stop on its way past everything that could hold it up.
//
// Rule: a stop orders the line low from the thread that hears of it, then faults the session (emergency stop). While it
// stands nothing raises the line and nothing arms. `clear` ends it: the session is not armed, and /arm is an act of its
// own. A stop that comes after a clear stands, whichever the loop sees first.
#pragma once

#include "base/event.hpp"

#include <atomic>
#include <optional>

namespace millpond {

/// Thread: stop and clear from control, the rest from the loop.
class EmergencyStop {
  public:
    void stop(const ChangedBy& by) noexcept {
        by_.store(static_cast<std::uint64_t>(by.source) << 48 | static_cast<std::uint64_t>(by.port) << 32 | by.address,
                  std::memory_order_relaxed);
        // Sequentially consistent, as `stopped` is read: the line is ordered low after this, and the loop looks after
        // it has raised the line; one of the two sees the other.
        stopped_.store(true);
        stops_.fetch_add(1, std::memory_order_release); // publishes by_ to take's acquire
    }
    void clear() noexcept { stopped_.store(false); }
    [[nodiscard]] bool stopped() const noexcept { return stopped_.load(); }

    /// Who gave the newest stop that was not taken yet, be it cleared by now or not.
    [[nodiscard]] std::optional<ChangedBy> take() noexcept {
        const auto stops = stops_.load(std::memory_order_acquire);
        if (stops == taken_) {
            return std::nullopt;
        }
        taken_ = stops;
        const auto by = by_.load(std::memory_order_relaxed);
        return ChangedBy{static_cast<ChangeSource>(by >> 48), static_cast<std::uint16_t>(by >> 32),
                         static_cast<std::uint32_t>(by)};
    }

  private:
    std::atomic<std::uint64_t> by_{0};
    std::atomic<bool> stopped_{false};
    std::atomic<std::uint32_t> stops_{0};
    std::uint32_t taken_ = 0; // the loop's own
};

} // namespace millpond
