// The pass of the envelope detector: band-pass and envelope of every looked-at channel, and of their mean. Thread: one.
#pragma once

#include "base/channels.hpp"
#include "detector/detector.hpp"
#include "tuning/statistic_pass.hpp"

namespace millpond {

class EnvelopePass : public StatisticPass {
  public:
    /// Refuses settings that the rate cannot carry.
    EnvelopePass(const DetectorSettings& settings, const Channels& channels, Hertz rate)
        : detector_(Detector::make(settings, channels, rate)) {}

    [[nodiscard]] std::size_t values() const noexcept override { return detector_.envelope_stride(); }
    [[nodiscard]] std::size_t finite_frames(const FrameBlock& block) const noexcept override {
        return detector_.finite_frames(block);
    }
    [[nodiscard]] std::uint64_t settle_frames() const noexcept override { return detector_.filter_settle_frames(); }
    [[nodiscard]] double delay_samples() const noexcept override { return detector_.delay_samples(); }
    void gap(SampleIndex resumes_at) noexcept override { detector_.gap(resumes_at); }
    void run(const FrameBlock& block, std::span<double> statistics) noexcept override {
        detector_.envelopes(block, statistics);
    }

    /// True where both give the same statistics: one pass serves both.
    [[nodiscard]] static bool shared_by(const DetectorSettings& a, const DetectorSettings& b) noexcept {
        return a.filter == b.filter && a.envelope == b.envelope && a.vote.rule == b.vote.rule;
    }

  private:
    Detector detector_;
};

} // namespace millpond
