// The learned mix: covariances in the ripple band, and the direction between them. Thread: cold. Private to this room.
#pragma once

#include "tuning/joined_score.hpp"

#include <vector>

namespace millpond {

struct LearnedMix {
    std::vector<double> weights, pattern; ///< by looked-at channel
    std::vector<double> background;       ///< lower triangle by rows, uV^2
    double gain = 0.0, mean_gain = 0.0;   ///< power inside ripples against outside: of the mix, of the mean over sites
};

/// `training`: one for each recording. Refuses recordings whose looked-at channels differ, or without ripples.
[[nodiscard]] LearnedMix learn_mix(std::span<const TuningRecording> recordings, std::span<const Intervals> training,
                                   Hertz rate, double shrinkage);

} // namespace millpond
