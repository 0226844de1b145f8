// Strong types for the three quantities that are confused most easily: a place in the stream, a rate and a time.
// Thread: all.
#pragma once

#include <chrono>
#include <compare>
#include <cstdint>

namespace millpond {

/// A place in the stream, counted in frames from the first frame of the session or recording. Never a time.
/// Missing frames are counted too, so that a place stays true across a gap.
struct SampleIndex {
    std::uint64_t value = 0;
    auto operator<=>(const SampleIndex&) const = default;
};

constexpr SampleIndex operator+(SampleIndex at, std::uint64_t frames) noexcept {
    return SampleIndex{at.value + frames};
}

/// Frames from `earlier` to `later`; `later` must not lie before `earlier`.
constexpr std::uint64_t operator-(SampleIndex later, SampleIndex earlier) noexcept {
    return later.value - earlier.value;
}

struct Hertz {
    double value = 0.0;
    auto operator<=>(const Hertz&) const = default;
};

using Nanos = std::chrono::nanoseconds;

/// Time from the first frame to `at`, in seconds.
constexpr double seconds_at(SampleIndex at, Hertz rate) noexcept {
    return static_cast<double>(at.value) / rate.value;
}

/// Whole frames in `ms`, rounded to the nearest; 0 stays 0, anything above it gives at least one frame.
constexpr std::uint64_t frames_in_ms(double ms, Hertz rate) noexcept {
    if (ms <= 0.0) {
        return 0;
    }
    const auto frames = static_cast<std::uint64_t>(ms * rate.value / 1000.0 + 0.5);
    return frames == 0 ? 1 : frames;
}

} // namespace millpond
