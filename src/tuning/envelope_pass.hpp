// The pass of both methods. Envelope: band-pass and envelope of every looked-at channel, and of their mean. Evidence:
// envelopes of its features, and their weighted sum, whose course does not depend on the threshold either. Thread: one.
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
        auto evidence = a.evidence; // all of it but what only sets the threshold
        evidence.false_per_minute = b.evidence.false_per_minute;
        evidence.calibration = b.evidence.calibration;
        return a.method == b.method && a.filter == b.filter && a.envelope == b.envelope && a.vote.rule == b.vote.rule &&
               evidence == b.evidence;
    }

    /// Where the statistic of floor `i` stands among a frame's values.
    [[nodiscard]] std::size_t floor_column(std::size_t i) const noexcept { return detector_.floor_column(i); }
    [[nodiscard]] std::size_t floor_count() const noexcept { return detector_.floor_count(); }

  private:
    Detector detector_;
};

} // namespace millpond
