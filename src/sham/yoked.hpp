// A schedule from another session: its pulses, at the same times from a moment that both sessions have. Thread: cold.
#pragma once

#include "sham/schedule.hpp"

namespace millpond {

struct YokedPlan {
    SampleIndex moment{};    ///< of the source: its first sample, when it was armed, the start of an epoch
    double start_s = 0.0;    ///< where that moment lies in the stream that plays the schedule
    double duration_s = 0.0; ///< length of the schedule from there on; 0: as long as the source
    /// Each place later by a delay drawn uniformly between the two (equal: a fixed one); both 0: none.
    double least_delay_ms = 0.0, most_delay_ms = 0.0;
    std::uint64_t seed = 1; ///< of those draws
    // To these, places that a delay brings too near to each other are put off.
    double min_interval_ms = 150.0;
    std::uint32_t max_pulses_per_second = 4;
    std::uint32_t max_pulses_per_minute = 120;
};

struct YokedSchedule : MadeSchedule {
    std::uint64_t before = 0; ///< places of the source before the moment: left out
    std::uint64_t after = 0;  ///< places beyond the duration: left out
};

/// `source` ascending. Without a delay each place is kept to the sample, and none is put off: check_schedule refuses
/// those that the limits do not allow. Refuses delays that contradict each other.
[[nodiscard]] YokedSchedule yoked_schedule(const Schedule& source, const YokedPlan& plan, Hertz rate);

} // namespace millpond
