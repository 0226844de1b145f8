// Samples as raw interleaved frames, int16 or float32 with the least significant byte first, from a file descriptor.
// Thread: control makes it; loop calls receive.
#pragma once

#include "intake/sample_source.hpp"
#include "intake/stream_settings.hpp"

#include <vector>

namespace millpond {

/// Each block holds what was there, at most 64 KiB of input or 100 ms of signal. Input that comes faster than eight
/// times real pace, as from a file, is held back to that. The end of the input inside a frame is counted as truncated.
/// A read carries no time of arrival, so `arrived_ns` stays 0.
class PipeSource final : public SampleSource {
  public:
    /// `settings` is what `resolved` returned. `descriptor` stays the caller's and must stay open (0: standard input).
    PipeSource(const StreamSettings& settings, int descriptor);

    Received receive(Nanos timeout, Arrival& arrival) noexcept override;

    [[nodiscard]] const PacketCounts& counts() const noexcept override { return counts_; }
    [[nodiscard]] Hertz rate() const noexcept override { return rate_; }
    [[nodiscard]] std::size_t channels() const noexcept override { return channels_; }

  private:
    bool hold_back(Nanos timeout) noexcept;
    Received finish(Arrival& arrival) noexcept;
    void hand_out(Arrival& arrival) noexcept;
    void keep_rest() noexcept;

    int descriptor_;
    Hertz rate_;
    std::size_t channels_;
    SampleEncoding encoding_;
    float microvolts_per_count_;
    std::size_t frame_bytes_;
    std::vector<std::uint8_t> bytes_;
    std::vector<float> samples_;
    std::size_t filled_ = 0; // bytes read and not yet kept for the next block
    std::size_t used_ = 0;   // of these, bytes handed out by the last block
    SampleIndex next_;
    Nanos began_{};
    PacketCounts counts_{};
    bool ended_ = false;
};

} // namespace millpond
