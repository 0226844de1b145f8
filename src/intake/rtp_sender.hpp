// Sends frames as RTP packets by UDP, and waits for the moment at which each is due: the stand-in for a rig.
// Thread: one, whoever owns it. Errors: what cannot be sent throws Refusal.
#pragma once

#include "base/units.hpp"
#include "intake/sample_format.hpp"
#include "intake/sdp.hpp"

#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace millpond {

struct RtpSenderSettings {
    SdpStream stream; ///< where to, and how the samples stand in the packets
    float microvolts_per_count = 1.0F;
    std::uint32_t frames_per_packet = 1;
    std::uint64_t lose_every = 0; ///< every so many packets one is left out, for drills; 0: none
};

struct RtpSenderCounts {
    std::uint64_t packets = 0;  ///< handed to the kernel
    std::uint64_t left_out = 0; ///< by lose_every
    std::uint64_t refused = 0;  ///< by the kernel: nobody listens there, or no room
    std::uint64_t frames = 0;
    EncodeLosses losses;
};

class RtpSender {
  public:
    /// SSRC, first sequence number and first time stamp are random, as RFC 3550, 5.1 and 8.1 ask.
    explicit RtpSender(const RtpSenderSettings& settings);

    /// One packet of at most frames_per_packet frames (microvolts, shape as in base/frames.hpp), stamped with the
    /// moment of sending where the stream has a send time.
    void send(std::span<const float> microvolts);

    [[nodiscard]] const RtpSenderCounts& counts() const noexcept { return counts_; }

  private:
    RtpSenderSettings settings_;
    boost::asio::io_context context_;
    boost::asio::ip::udp::socket socket_{context_};
    std::vector<std::uint8_t> bytes_;
    std::uint16_t sequence_;
    std::uint32_t timestamp_;
    std::uint32_t ssrc_;
    RtpSenderCounts counts_;
};

/// Absolute deadlines at a stream's own pace, so that lateness never adds up.
class Pace {
  public:
    /// Frame 0 is due now. `speed` 2 is twice real pace.
    Pace(Hertz rate, double speed);

    /// Sleeps until `frame` is due. False where a signal woke it before.
    bool wait_for(std::uint64_t frame);

    [[nodiscard]] Nanos most_late() const noexcept { return most_late_; }

  private:
    double ns_per_frame_;
    Nanos start_;
    Nanos most_late_{0};
};

} // namespace millpond
