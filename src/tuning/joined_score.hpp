// Recordings one after the other on one axis of frames, so that one score covers all of them. Thread: one.
#pragma once

#include "base/channels.hpp"
#include "tuning/sweep_figures.hpp"

#include <span>
#include <vector>

namespace millpond {

struct TuningRecording {
    Channels channels;
    std::span<const float> data; ///< shape as in base/frames.hpp; must outlive the sweep
    Ripples truth;
    Intervals excluded{}; ///< time that the truth does not speak of: never eligible

    [[nodiscard]] std::uint64_t frames() const noexcept { return data.size() / channels.size(); }
};

/// Training and held-out parts of a recording.
struct Parts {
    Intervals training, held_out;
};
[[nodiscard]] Parts parts_of(std::uint64_t frames, std::uint64_t block_frames);

class JoinedScore {
  public:
    void add(const TuningRecording& recording, const std::vector<SampleIndex>& detections, const Intervals& eligible,
             std::uint64_t block_frames);
    [[nodiscard]] SweepResult result(double early_ms, Hertz rate) const;

  private:
    void append(Intervals& to, const Intervals& from) const;

    Ripples ripples_;
    std::vector<SampleIndex> detections_;
    Intervals training_, held_out_;
    std::uint64_t offset_ = 0;
};

} // namespace millpond
