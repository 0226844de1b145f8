// One pass over a recording for many settings: what each would have detected, had no pulse been given. Thread: one.
#pragma once

#include "base/channels.hpp"
#include "referee/eligible_time.hpp"
#include "tuning/statistic_pass.hpp"

#include <atomic>

namespace millpond {

struct Found {
    std::vector<SampleIndex> detections; ///< as detections_to_score gives them of the engine in condition none
    Intervals eligible;                  ///< the detector's reading of eligible_time.hpp, likewise
};

struct PassFindings {
    std::vector<Found> found; ///< one for each setting, in their order; empty where it was stopped
    double delay_samples = 0.0;
};

/// True where one pass serves both settings.
[[nodiscard]] bool share_a_pass(const DetectorSettings& a, const DetectorSettings& b) noexcept;

/// `settings` share a pass. `data`: shape as in base/frames.hpp, from the recording's first frame; missing frames are
/// non-finite. Refuses settings that the rate cannot carry. Ends early where `stop` turns true. `seen` hears of every
/// frame. Memory: a few hundred kilobytes, 12 bytes a detection, whatever the recording's length.
[[nodiscard]] PassFindings run_shared_pass(std::span<const DetectorSettings> settings, const Channels& channels,
                                           Hertz rate, std::span<const float> data, const std::atomic<bool>& stop,
                                           std::atomic<std::uint64_t>& seen);

} // namespace millpond
