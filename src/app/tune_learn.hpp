// `tune --learn`: the evidence detector from recordings, with its figures on training and held-out parts. Thread: cold.
#pragma once

#include "app/tune_plan.hpp"

#include <string>

namespace millpond {

struct LearnOutcome {
    DetectorSettings detector;
    SweepResult figures;
    std::string text; ///< what was learned, for people
};

[[nodiscard]] LearnOutcome learn_from(const TuneOptions& options, const TunePlan& plan);

} // namespace millpond
