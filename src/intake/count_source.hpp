// Samples as a data acquisition board counts them: unsigned integers of this computer's byte order, interleaved, from a
// descriptor. Thread: control makes it; loop calls receive.
#pragma once

#include "intake/sample_source.hpp"

#include <cstdint>
#include <vector>

namespace millpond {

/// What the counts of one channel are worth: microvolts = least + step * count.
struct CountScale {
    float least_uv = 0.0F, step_uv = 1.0F;
};

struct CountFormat {
    Hertz rate;
    std::vector<CountScale> channels;
    std::size_t bytes_per_sample = 2; ///< 2 or 4
};

/// Each block holds what was there, at most 100 ms of signal or 64 KiB. A read carries no time of arrival, so
/// `arrived_ns` stays 0. A read that fails, as a board's does once its buffer ran over, is the end of the stream.
class CountSource : public SampleSource {
  public:
    /// `descriptor` stays the caller's, must stay open and must not block.
    CountSource(CountFormat format, int descriptor);

    Received receive(Nanos timeout, Arrival& arrival) noexcept override;

    [[nodiscard]] const PacketCounts& counts() const noexcept override { return counts_; }
    [[nodiscard]] Hertz rate() const noexcept override { return format_.rate; }
    [[nodiscard]] std::size_t channels() const noexcept override { return format_.channels.size(); }

  private:
    void hand_out(Arrival& arrival) noexcept;
    void keep_rest() noexcept;

    CountFormat format_;
    int descriptor_;
    std::size_t frame_bytes_;
    std::vector<std::uint8_t> bytes_;
    std::vector<float> samples_;
    std::size_t filled_ = 0; // bytes read and not yet kept for the next block
    std::size_t used_ = 0;   // of these, bytes handed out by the last block
    SampleIndex next_;
    PacketCounts counts_{};
};

} // namespace millpond
