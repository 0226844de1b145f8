// Two watches over what comes in: missing frames, and floors that leave their range.
// Thread: loop for everything but make and expect. Allocates after those: never.
#pragma once

#include "arbiter/limits_settings.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <array>
#include <vector>

namespace millpond {

/// Gaps and lost frames within a minute: the second of the stream that a gap ends in and the 59 before it.
class GapWatch {
  public:
    static GapWatch make(const LimitsSettings& settings, Hertz rate);

    /// True: too many gaps, or too many frames lost.
    [[nodiscard]] bool gap(SampleIndex from, std::uint64_t frames) noexcept;
    void reset() noexcept;

  private:
    struct Second {
        std::uint64_t gaps = 0, lost = 0;
    };
    Second& second(std::uint64_t number) noexcept;

    std::uint64_t second_frames_ = 1, most_gaps_ = 0, most_lost_ = 0;
    std::array<Second, 60> seconds_{}; // ring
    std::uint64_t newest_ = 0;
};

/// Deviations of floors against their range in uV, and against what they were when they had just settled. A deviation
/// is the scale of what a site shows without ripples; a mean is not: that of the evidence may be below 0.
class FloorWatch {
  public:
    static FloorWatch make(const FloorLimitSettings& settings);
    /// So many floors will be told of. Thread: control.
    void expect(std::size_t floors) { settled_at_.resize(floors); }

    /// Floor `i` as it is now. True: out of range. One that has not settled never is.
    [[nodiscard]] bool floor(std::size_t i, const FloorDetail& floor) noexcept;

  private:
    FloorLimitSettings settings_;
    // What each was when it had just settled, in time with gates open and in the rest; 0: not yet.
    std::vector<std::array<double, 2>> settled_at_;
};

} // namespace millpond
