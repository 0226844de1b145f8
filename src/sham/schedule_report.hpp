// What a schedule amounts to, said before it is used. Thread: cold.
#pragma once

#include "referee/ripple.hpp"
#include "referee/scoring.hpp"
#include "sham/schedule.hpp"
#include "sham/two_sample_test.hpp"

#include <optional>
#include <string>

namespace millpond {

/// How much of the time is ripple: rate x mean duration, which is the share of places expected inside ripples where the
/// places know nothing of the ripples and ripples do not overlap. At most 1.
struct RippleTime {
    double rate_per_s = 0.0, mean_duration_ms = 0.0;
    std::string of; ///< whose they are, for people

    [[nodiscard]] double share() const noexcept;
};

/// From ripples: their rate from the first onset to the last, and the mean of their durations. Refuses fewer than two;
/// `where` names them.
[[nodiscard]] RippleTime ripple_time(const Ripples& ripples, Hertz rate, const std::string& where);

/// Places within [onset - early, end] of a ripple. `ripples` by onset.
[[nodiscard]] bool inside(const Ripples& ripples, SampleIndex at, std::uint64_t early_frames = 0) noexcept;

/// What a schedule is compared with. All of it may be missing.
struct ReportInput {
    Schedule source;         ///< pulses or triggers that it stands for; empty: none
    std::string source_name; ///< for people
    std::optional<RippleTime> ripple_time;
    std::optional<Ripples> ripples; ///< in the stream of the schedule
};

struct ScheduleReport {
    std::uint64_t places = 0;
    double first_s = not_known, last_s = not_known, rate_per_s = not_known;
    Distribution intervals_s, source_intervals_s;
    std::string source_name;
    TwoSampleTest compared; ///< intervals against the source's
    Crowding crowding;
    ScheduleLimits limits;
    std::optional<RippleTime> ripple_time;
    std::optional<Proportion> inside; ///< of the places, as they stand over the ripples of the table
};

[[nodiscard]] ScheduleReport report_on(const Schedule& schedule, const ScheduleLimits& limits, const ReportInput& with,
                                       Hertz rate);

/// Lines for people, each with its name first.
[[nodiscard]] std::string told(const ScheduleReport& report);

} // namespace millpond
