// What a user may say about a control schedule that is made from a settings file alone. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>

namespace millpond {

struct ScheduleSettings {
    double rate_per_s = 0.5; ///< near the 0.58 to 0.66 ripples a second of awake rest, 0.5 of sleep
    double start_s = 0.0;
    double duration_s = 3600.0;
    double min_interval_ms = 0.0;
    std::uint64_t seed = 1;

    bool operator==(const ScheduleSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ScheduleSettings& schedule) {
    visit.number("rate_per_s", schedule.rate_per_s, {1e-6, 1000.0}, "places a second, on average");
    visit.number("start_s", schedule.start_s, {0.0, 1e6}, "no place before this, from the stream's first sample");
    visit.number("duration_s", schedule.duration_s, {1.0, 1e6}, "length of the schedule, from start_s on");
    visit.number("min_interval_ms", schedule.min_interval_ms, {0.0, 60000.0},
                 "shortest interval between two places; 0: the lock-out");
    visit.whole("seed", schedule.seed, {0, 1e15}, "of the draws: the same seed, the same schedule (xoshiro256++)");
}

} // namespace millpond
