// Knows triggers that look as if pulses led to them, in two ways.
//
// Too many: were triggers to come at random, on average `expected_per_s` (a Poisson process), then a stretch of
// `window_s` with `most_in_window` of them would turn up by chance at most `false_alarms_per_hour` times an hour. The
// bound is exact in one direction: a stretch with N triggers holds one that begins with a trigger, and the expected
// number of triggers in an hour that have N - 1 others within `window_s` behind them is 3600 * rate * P(X >= N - 1), X
// Poisson with mean rate * window (Mecke's formula; from memory). Lock-out and limits thin the process and lower it
// further. Ripples that come in bursts raise it: leave room in `expected_per_s`.
//
// At a fixed interval: the last `equal_intervals` intervals are all shorter than `equal_below_ms` and no two differ by
// more than `equal_within_ms`. Were triggers to come at random at r a second, each further interval would fall into
// such a width w with a chance below r * w, 0.006 for 1.5 a second and 4 ms. That 8 lie so by chance: about 8 *
// 0.006^7, 2e-15.
//
// What is counted: triggers, and detections that nothing but a limit on their number withheld, so that a limit does not
// hide a runaway. Thread: loop for everything but make. Allocates after make: never.
#pragma once

#include "arbiter/limits_settings.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <vector>

namespace millpond {

/// Least N for which 3600 * rate * P(X >= N - 1) is at most `false_alarms_per_hour`, X Poisson with mean rate * window.
[[nodiscard]] std::uint32_t runaway_bound(double expected_per_s, double window_s, double false_alarms_per_hour);

class RunawayGuard {
  public:
    static RunawayGuard make(const RunawaySettings& settings, Hertz rate);

    /// A detection that was judged. True: a runaway.
    [[nodiscard]] bool judged(SampleIndex at, Rule rule) noexcept;
    /// What came before counts no longer.
    void reset() noexcept;

    [[nodiscard]] std::uint32_t most_in_window() const noexcept { return static_cast<std::uint32_t>(seen_.size()); }

  private:
    [[nodiscard]] bool too_many(SampleIndex at) noexcept;
    [[nodiscard]] bool too_equal(SampleIndex at) noexcept;

    bool on_ = false;
    std::uint64_t window_frames_ = 0, within_frames_ = 0, below_frames_ = 0;
    std::vector<SampleIndex> seen_; // ring of as many as are too many
    std::uint64_t seen_count_ = 0;
    std::vector<std::uint64_t> intervals_; // ring of those that may be equal
    std::uint64_t interval_count_ = 0;
    SampleIndex newest_{};
    bool any_ = false;
};

} // namespace millpond
