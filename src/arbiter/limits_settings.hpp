// What a user may say about how much is too much. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <vector>

namespace millpond {

/// When triggers look as if the pulses themselves led to them. See arbiter/runaway_guard.hpp.
struct RunawaySettings {
    bool on = true;
    // A little above twice the 0.58 to 0.66 ripples a second of awake rest (Deceuninck & Kloosterman 2024, eLife
    // 13:e84004), to leave room for doublets and false detections.
    double expected_per_s = 1.5;
    double window_s = 20.0;
    double false_alarms_per_hour = 1e-6;
    std::uint32_t equal_intervals = 8;
    double equal_within_ms = 4.0;
    double equal_below_ms = 400.0;

    bool operator==(const RunawaySettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RunawaySettings& runaway) {
    visit.flag("on", runaway.on, "whether triggers that look like a runaway fault the session");
    visit.number("expected_per_s", runaway.expected_per_s, {0.001, 100.0},
                 "triggers a second that are expected at most, for long; more than chance makes of that is a runaway");
    visit.number("window_s", runaway.window_s, {0.1, 600.0}, "stretch in which triggers are counted");
    visit.number("false_alarms_per_hour", runaway.false_alarms_per_hour, {1e-15, 1.0},
                 "how often chance alone may look like a runaway where triggers come as expected, at random");
    visit.whole("equal_intervals", runaway.equal_intervals, {3, 64},
                "so many equal intervals in a row between triggers are a runaway too");
    visit.number("equal_within_ms", runaway.equal_within_ms, {0.1, 100.0},
                 "intervals are equal that differ by no more than this");
    visit.number("equal_below_ms", runaway.equal_below_ms, {0.0, 60000.0},
                 "longer intervals are never taken for a pulse that led to the next; 0: none is");
}

/// Another range for one floor.
struct FloorRangeSettings {
    std::uint32_t channel = 0;
    double least_uv = 0.0;
    double most_uv = 100000.0;

    bool operator==(const FloorRangeSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FloorRangeSettings& range) {
    visit.whole("channel", range.channel, {0, 256},
                "number of the channel in the stream, from 1; 0: the mean over sites or the evidence");
    visit.number("least_uv", range.least_uv, {0.0, 100000.0}, "the deviation of its floor must not be lower");
    visit.number("most_uv", range.most_uv, {0.001, 100000.0}, "nor higher");
}

struct FloorLimitSettings {
    double least_uv = 0.0;
    double most_uv = 100000.0;
    double least_times = 0.2;
    double most_times = 5.0;
    std::vector<FloorRangeSettings> channels;

    bool operator==(const FloorLimitSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FloorLimitSettings& floor) {
    visit.number("least_uv", floor.least_uv, {0.0, 100000.0},
                 "no settled floor's deviation may be lower (evidence: weighted uV)");
    visit.number("most_uv", floor.most_uv, {0.001, 100000.0}, "nor higher");
    visit.number("least_times", floor.least_times, {0.0, 1.0},
                 "nor lower than so many times what it was when it had just settled");
    visit.number("most_times", floor.most_times, {1.0, 1e6}, "nor higher than so many times that");
    visit.list("channels", floor.channels, "other ranges in uV for single channels");
}

struct LimitsSettings {
    std::uint32_t max_pulses_per_second = 4;
    std::uint32_t max_pulses_per_minute = 120;
    std::uint32_t max_pulses_per_epoch = 10000;
    std::uint32_t max_pulses_per_session = 10000;
    double min_interval_ms = 0.0;
    std::uint32_t max_gaps_per_minute = 60;
    double max_lost_percent = 10.0;
    FloorLimitSettings floor;
    RunawaySettings runaway;

    bool operator==(const LimitsSettings&) const = default;
};

/// The same without what counts over long stretches or faults a session: for sweeps, whose worst candidates cross all
/// the time and are to be scored all the same.
[[nodiscard]] inline LimitsSettings for_sweeps(LimitsSettings limits) {
    limits.max_pulses_per_minute = 60000;
    limits.max_pulses_per_epoch = limits.max_pulses_per_session = 10000000;
    limits.max_gaps_per_minute = 0;
    limits.max_lost_percent = 100.0;
    limits.floor = {0.0, 100000.0, 0.0, 1e6, {}};
    limits.runaway.on = false;
    return limits;
}

template <class Visitor> void describe(Visitor& visit, LimitsSettings& limits) {
    visit.whole("max_pulses_per_second", limits.max_pulses_per_second, {1, 1000},
                "triggers within any one second of the stream, the same in every condition");
    visit.whole("max_pulses_per_minute", limits.max_pulses_per_minute, {1, 60000},
                "triggers within any one minute of the stream");
    visit.whole("max_pulses_per_epoch", limits.max_pulses_per_epoch, {1, 10000000},
                "triggers within one epoch of the plan; without a plan the session is one epoch");
    visit.whole("max_pulses_per_session", limits.max_pulses_per_session, {1, 10000000}, "triggers within one session");
    visit.number("min_interval_ms", limits.min_interval_ms, {0.0, 600000.0},
                 "least time from one trigger to the next, where it is longer than arbiter.lockout_ms");
    visit.whole("max_gaps_per_minute", limits.max_gaps_per_minute, {0, 100000},
                "more gaps than this within a minute fault the session; 0: any number is allowed");
    visit.number("max_lost_percent", limits.max_lost_percent, {0.0, 100.0},
                 "more lost frames than this share of a minute fault the session; 100: any share is allowed");
    visit.group("floor", limits.floor, "range that a floor must stay in; outside it the session is faulted");
    visit.group("runaway", limits.runaway, "when triggers look as if pulses led to them");
}

} // namespace millpond
