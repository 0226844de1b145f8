// Samples on their way through the house: frames of all channels, in microvolts. Thread: all.
#pragma once

#include "base/units.hpp"

#include <cstddef>
#include <span>

namespace millpond {

/// A run of consecutive frames that somebody else owns.
/// Shape: `data[frame * channels + channel]`, microvolts, channels in stream order (roles are applied by the detector).
/// A non-finite value on a used channel makes its frame count as missing.
struct FrameBlock {
    SampleIndex first;           ///< place of the first frame
    std::size_t channels = 0;    ///< values a frame
    std::span<const float> data; ///< size is a multiple of `channels`

    [[nodiscard]] std::size_t frames() const noexcept { return channels == 0 ? 0 : data.size() / channels; }

    /// The part from frame `from` (counted in this block) of `count` frames.
    [[nodiscard]] FrameBlock part(std::size_t from, std::size_t count) const noexcept {
        return {first + from, channels, data.subspan(from * channels, count * channels)};
    }
};

} // namespace millpond
