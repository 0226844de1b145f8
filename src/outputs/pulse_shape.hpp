// How long a line is high and how often, for one trigger. Thread: control.
#pragma once

#include "base/units.hpp"
#include "outputs/output_settings.hpp"

#include <cstdint>

namespace millpond {

struct PulseShape {
    Nanos width{1'000'000};
    std::uint32_t count = 1;
    Nanos period{10'000'000};
};

/// Refuses a train whose pulses would overlap.
[[nodiscard]] PulseShape pulse_shape(const OutputSettings& settings);

/// How long the line may be high before the watchdog lowers it. Refuses a time that is not longer than the pulse.
[[nodiscard]] Nanos longest_high(const OutputSettings& settings);

} // namespace millpond
