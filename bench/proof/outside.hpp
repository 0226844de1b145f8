// Known ripples put into a recording that nobody here made. Thread: cold.
//
// The recording holds no ripples of its own, or is taken to. It is repeated, each time with other ripples in it; where
// one repeat meets the next a frame is missing, so that nothing sees a step there. A repeated background repeats its
// false detections as well: their rate comes in whole numbers for each time through the recording, but for those that
// a ripple covers, and `at most 0.3` means next to none.
#pragma once

#include "proof/figures.hpp"

#include <filesystem>

namespace millpond::bench {

struct Outside {
    std::string name;
    Channels channels; ///< one, of role ripple
    Hertz rate;
    std::vector<float> once; ///< its first channel
};

/// Refuses what cannot be read.
[[nodiscard]] Outside load_outside(const std::filesystem::path& recording);

/// One recording for each of `seeds` seeds from `first_seed`, each `repeats` times through it, with ripples `scale`
/// times as large as a scene's.
[[nodiscard]] std::vector<ProofRecording> injected(const Outside& outside, std::uint64_t first_seed, std::size_t seeds,
                                                   std::size_t repeats, double scale);

/// The scale at which the floor reaches `share` of the ripples at 1 false a minute.
[[nodiscard]] double scale_for(const Outside& outside, std::uint64_t seed, std::size_t repeats, double share);

/// The floor of injected recordings, whose background is `outside` itself.
[[nodiscard]] Curve outside_floor(const Outside& outside, const std::vector<ProofRecording>& recordings,
                                  std::span<const double> false_per_minute);

/// The recording turned by half its length: what was its second half comes first.
[[nodiscard]] Outside turned(const Outside& outside);

} // namespace millpond::bench
