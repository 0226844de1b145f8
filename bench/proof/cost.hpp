// What a frame costs, ours beside the textbook chain, in the whole engine. Thread: bench.
#pragma once

#include "base/units.hpp"
#include "detector/detector_settings.hpp"

namespace millpond::bench {

struct Cost {
    double textbook_ns = 0.0, ours_ns = 0.0; ///< a frame: medians of repeats in turn

    [[nodiscard]] double ratio() const noexcept { return ours_ns / textbook_ns; }
};

/// On noise; `ours` gets a mix over all channels where it names a learned one.
[[nodiscard]] Cost cost_of(const DetectorSettings& textbook, const DetectorSettings& ours, std::size_t sites,
                           bool reference, Hertz rate, double seconds);

} // namespace millpond::bench
