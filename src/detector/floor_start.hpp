// The floor's first second: medians, so that a start-up artefact or an early ripple does not poison what follows.
// Thread: loop, after make. For this room and for sweeps.
#pragma once

#include <cstddef>
#include <cstdint>
#include <vector>

namespace millpond {

class FloorStart {
  public:
    /// Looks at up to 256 frames spread evenly over `frames`.
    static FloorStart make(std::size_t lanes, std::uint64_t frames);

    /// Takes one frame of envelopes, one a lane. True once all were seen.
    bool take(const double* envelopes) noexcept;

    /// Median of each lane's envelope, and the median distance from it scaled to a mean distance. After `take` said
    /// true.
    void read(double* mean, double* spread) noexcept;

    void reset() noexcept { seen_ = 0; }
    [[nodiscard]] std::uint64_t frames() const noexcept { return frames_; }
    [[nodiscard]] bool done() const noexcept { return seen_ >= frames_; }
    void skip() noexcept { seen_ = frames_; }

  private:
    std::size_t lanes_ = 0;
    std::uint64_t frames_ = 0, stride_ = 1, seen_ = 0;
    std::vector<double> kept_; // [lane][sample]
    std::size_t capacity_ = 0;
};

} // namespace millpond
