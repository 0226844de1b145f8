// A schedule at random: a rate and a minimum interval, nothing else. Thread: cold.
#pragma once

#include "referee/ripple.hpp"
#include "sham/schedule.hpp"

namespace millpond {

/// Intervals of min_interval_ms plus an exponential rest: a Poisson process with a dead time, `rate_per_s` on average.
struct RateMatchedPlan {
    double rate_per_s = 0.5;
    double start_s = 0.0;       ///< no place before this, in the stream that plays it
    double duration_s = 3600.0; ///< length of the schedule from there on
    double min_interval_ms = 150.0;
    std::uint32_t max_pulses_per_second = 4;
    std::uint32_t max_pulses_per_minute = 120;
    std::uint64_t seed = 1;
    Ripples keep_away_from; ///< no place in these, nor `keep_away_ms` before or after; empty: anywhere
    double keep_away_ms = 0.0;
};

/// With ripples to keep away from, the law runs in the time that is left, faster, so that the rate over the whole
/// duration holds. Refuses a rate that the minimum interval or the pulses per minute cannot give.
[[nodiscard]] MadeSchedule rate_matched_schedule(const RateMatchedPlan& plan, Hertz rate);

} // namespace millpond
