// A ripple as truth: from the generator, from a person's labels or from the referee. Thread: cold.
#pragma once

#include "base/units.hpp"

#include <vector>

namespace millpond {

/// A reference event: the closed interval [onset, end] with its peak.
struct Ripple {
    SampleIndex onset;
    SampleIndex peak;
    SampleIndex end;            ///< last frame of the ripple
    double peak_envelope = 0.0; ///< uV; 0 where the truth does not say

    bool operator==(const Ripple&) const = default;
};

/// In order of their onsets.
using Ripples = std::vector<Ripple>;

} // namespace millpond
