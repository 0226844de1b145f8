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

/// What thresholds are counted from, and the distance that they are counted in.
struct Floor {
    double centre = 0.0; ///< mean or median
    double spread = 0.0; ///< SD, or third quartile - median
    std::uint64_t frames = 0;
};

/// Mean and SD of the values, none of them NaN; those above mean + `clip_deviations` SD counted as that, once or until
/// nothing moves; 0: none clipped.
[[nodiscard]] Floor clipped_mean(std::span<const float> values, double clip_deviations, bool clip_again);

/// Median and distance to the third quartile, with linear interpolation between neighbours. Sorts `values` partly.
[[nodiscard]] Floor median_and_quartile(std::span<float> values);

/// Events of one run of the envelope that begins at `first`.
[[nodiscard]] Ripples pick_ripples(std::span<const float> envelope, SampleIndex first, const Floor& floor,
                                   const RefereeSettings& settings, Hertz rate);

} // namespace millpond
