// How a sweep shares its work: a pass turns samples into statistics, which is dear and does not depend on thresholds;
// a rule turns statistics into detections for many settings at once, which is cheap. One pair for each kind of
// detector. Thread: one at a time, cold.
//
// What makes the sharing exact: the sweep scores detectors with no pulses given (condition none), so that nothing is
// blanked and the pass sees the same samples whatever the threshold. With pulses the detector holds its state after
// every trigger, filters splice there, and no two thresholds have a sample of envelope in common ever after.
#pragma once

#include "base/frames.hpp"
#include "detector/detector_settings.hpp"

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

namespace millpond {

class StatisticPass {
  public:
    virtual ~StatisticPass() = default;

    /// Numbers that a frame gives.
    [[nodiscard]] virtual std::size_t values() const noexcept = 0;
    /// Frames from the block's start that are not missing.
    [[nodiscard]] virtual std::size_t finite_frames(const FrameBlock& block) const noexcept = 0;
    /// Frames that the pass needs after the start and after a gap before a crossing counts.
    [[nodiscard]] virtual std::uint64_t settle_frames() const noexcept = 0;
    [[nodiscard]] virtual double delay_samples() const noexcept = 0;

    /// Frames from here within which the gate of the animal's state stays as it is.
    [[nodiscard]] virtual std::uint64_t frames_to_change() const noexcept = 0;

    /// Frames are missing before `resumes_at`; the first call of a recording is gap(0).
    virtual void gap(SampleIndex resumes_at) noexcept = 0;
    /// Over all of a block without missing frames: `statistics[frame * values() + i]`.
    virtual void run(const FrameBlock& block, std::span<double> statistics) noexcept = 0;
};

/// What one setting made of a recording.
struct Detections {
    std::vector<SampleIndex> places;      ///< decision samples, without those that the detector refused itself
    SampleIndex settled_from{UINT64_MAX}; ///< the whole second from which the floor's journal says settled
};

class CrossingRule {
  public:
    virtual ~CrossingRule() = default;
    virtual void gap(SampleIndex resumes_at) noexcept = 0;
    /// Statistics of the frames from `first` on, `values` each.
    virtual void take(SampleIndex first, std::span<const double> statistics, std::size_t values) = 0;
    /// One for each setting, in their order. Call once, at the end.
    [[nodiscard]] virtual std::vector<Detections> detections() = 0;
};

} // namespace millpond
