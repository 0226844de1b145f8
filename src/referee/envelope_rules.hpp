// The referee's steps after the band-pass, each on its own so that each can be checked. Thread: cold.
#pragma once

#include "base/units.hpp"
#include "referee/referee_settings.hpp"
#include "referee/ripple.hpp"

#include <cstddef>
#include <span>
#include <vector>

namespace millpond {

/// Runs [from, to) of frames that are not NaN.
struct FrameRun {
    std::size_t from, to;
};
[[nodiscard]] std::vector<FrameRun> finite_runs(std::span<const float> values);

/// Gaussian smoothing in place, truncated at 4 SD; at the ends of the span the weights that are left add up to 1.
void smooth_gaussian(std::span<float> values, double deviation_frames);

struct ClippedStatistics {
    double mean = 0.0, deviation = 0.0;
    std::uint64_t frames = 0;
};
/// Mean and SD of the values that are not NaN, those above mean + `clip_deviations` SD counted as that.
[[nodiscard]] ClippedStatistics clipped_statistics(std::span<const float> values, double clip_deviations);

/// Events of one run of the envelope that begins at `first`.
[[nodiscard]] Ripples pick_ripples(std::span<const float> envelope, SampleIndex first, const ClippedStatistics& floor,
                                   const RefereeSettings& settings, Hertz rate);

} // namespace millpond
