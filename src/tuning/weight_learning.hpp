// Weights of the evidence's features. Thread: cold. Private to this room.
#pragma once

#include "tuning/joined_score.hpp"

#include <cstddef>
#include <vector>

namespace millpond {

/// Envelopes of all features of one recording, every `stride`-th frame.
struct FeatureTrack {
    std::vector<float> values; ///< [frame][features], NaN where frames are missing or filters settle
    std::size_t stride = 1;    ///< frames of the recording from one to the next
    const TuningRecording* recording = nullptr;
    Intervals training;
};

/// One weight a feature, the largest +1 or -1. Refuses tracks without ripples or background.
[[nodiscard]] std::vector<double> learn_weights(std::span<const FeatureTrack> tracks, std::size_t features, Hertz rate);

} // namespace millpond
