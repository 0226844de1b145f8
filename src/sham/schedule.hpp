// Control schedules: places in the stream where pulses are due whatever the detector finds. Thread: cold.
//
// How they are made: yoked.hpp, rate_matched.hpp. What they amount to: schedule_report.hpp.
// In a file a schedule is an events table: onset (s), duration 0, trial_type `scheduled`, sample.
#pragma once

#include "base/units.hpp"

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

using Schedule = std::vector<SampleIndex>;

/// What a session allows; of a schedule that asks for more some places would have no pulse there.
struct ScheduleLimits {
    double lockout_ms = 150.0; ///< or the least interval of the limits, where that is longer
    std::uint32_t max_pulses_per_second = 4;
    std::uint32_t max_pulses_per_session = 10000;
    std::uint32_t max_pulses_per_minute = 120;
    std::uint32_t max_pulses_per_epoch = 10000;
    std::vector<double> epoch_starts_s; ///< of the plan's epochs, as far as they are known beforehand; none: no plan

    bool operator==(const ScheduleLimits&) const = default;
};

/// What was made, and what had to give way to the limits.
struct MadeSchedule {
    Schedule places;
    std::uint64_t put_off = 0; ///< places moved later to keep the minimum interval or the pulses per second
    double longest_put_off_ms = 0.0;
};

/// How near places come to the limits.
struct Crowding {
    std::uint64_t within_lockout = 0;   ///< places that come within the lock-out of the one before
    std::uint64_t beyond_second = 0;    ///< places that are one too many within one second
    std::uint64_t most_in_a_second = 0; ///< places in the fullest second
    std::uint64_t most_in_a_minute = 0; ///< places in the fullest minute
    std::uint64_t most_in_an_epoch = 0; ///< places in the fullest epoch
    std::size_t first_within_lockout = 0, first_beyond_second = 0; ///< indices, where there are any
};
[[nodiscard]] Crowding crowding(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate);

/// Refuses a schedule with places that come within the lock-out of the one before, with more within one second, minute,
/// epoch or session than allowed; names the first such place and says how many there are.
void check_schedule(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate, const std::string& where);

/// Places a second between the first and the last of them. Refuses fewer than two; `where` names them for the message.
[[nodiscard]] double rate_per_s_of(const Schedule& places, Hertz rate, const std::string& where);

/// Seconds from each place to the next.
[[nodiscard]] std::vector<double> intervals_s_of(const Schedule& places, Hertz rate);

/// Reads a schedule for a stream of this rate. Refuses rows of another trial_type, times that do not ascend or lie
/// before the first sample, and a `sample` column made for another rate.
[[nodiscard]] Schedule read_schedule(const std::filesystem::path& table, Hertz rate);

/// Never leaves half a file.
void write_schedule(const std::filesystem::path& table, const Schedule& schedule, Hertz rate);

} // namespace millpond
