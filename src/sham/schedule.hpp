// Control schedules: places in the stream where pulses are due whatever the detector finds. Thread: cold.
//
// In a file a schedule is an events table: onset (s), duration 0, trial_type `scheduled`, sample.
#pragma once

#include "base/units.hpp"
#include "referee/ripple.hpp"

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

using Schedule = std::vector<SampleIndex>;

/// What a session allows; a schedule that asks for more would be withheld there.
struct ScheduleLimits {
    double lockout_ms = 150.0;
    std::uint32_t max_pulses_per_second = 4;
};

/// What was made, and what had to give way to the limits.
struct MadeSchedule {
    Schedule places;
    std::uint64_t put_off = 0; ///< places moved later to keep the minimum interval or the pulses per second
    double longest_put_off_ms = 0.0;
};

/// Each trigger later by a delay drawn uniformly from `least_ms` to `most_ms` (equal: a fixed delay, nothing drawn).
struct DelayedPlan {
    double least_ms = 150.0; ///< random 150 to 250 ms, as in Deceuninck & Kloosterman 2024 (eLife 13:e84004)
    double most_ms = 250.0;
    double min_interval_ms = 150.0;
    std::uint32_t max_pulses_per_second = 4;
    std::uint64_t seed = 1;
};

/// As many places as `triggers` (ascending). A place too near to those before it is put off, never dropped, so that the
/// number of pulses stays matched.
[[nodiscard]] MadeSchedule delayed_schedule(const Schedule& triggers, const DelayedPlan& plan, Hertz rate);

/// Intervals of min_interval_ms plus an exponential rest: a Poisson process with a dead time, `rate_per_s` on average.
struct RateMatchedPlan {
    double rate_per_s = 0.5;
    double duration_s = 3600.0;
    double min_interval_ms = 150.0;
    std::uint32_t max_pulses_per_second = 4;
    std::uint64_t seed = 1;
    Ripples keep_away_from; ///< no place in these, nor `keep_away_ms` before or after; empty: anywhere
    double keep_away_ms = 0.0;
};

/// With ripples to keep away from, the law runs in the time that is left, faster, so that the rate over the whole
/// duration holds. Refuses a rate that the minimum interval cannot give.
[[nodiscard]] MadeSchedule rate_matched_schedule(const RateMatchedPlan& plan, Hertz rate);

/// Triggers a second between the first and the last of them. Refuses fewer than two; `where` names them for the
/// message.
[[nodiscard]] double trigger_rate_per_s(const Schedule& triggers, Hertz rate, const std::string& where);

/// Refuses the first place that comes within the lock-out of the one before, or is one too many within one second.
void check_schedule(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate, const std::string& where);

/// Reads a schedule for a stream of this rate. Refuses rows of another trial_type, times that do not ascend or lie
/// before the first sample, and a `sample` column made for another rate.
[[nodiscard]] Schedule read_schedule(const std::filesystem::path& table, Hertz rate);

/// Never leaves half a file.
void write_schedule(const std::filesystem::path& table, const Schedule& schedule, Hertz rate);

} // namespace millpond
