// One RTP packet, from bytes and to bytes: RFC 3550, 5.1, with the header extensions of RFC 8285.
// Thread: loop and sender. Allocates, locks, throws: never.
#pragma once

#include "base/event.hpp"

#include <cstddef>
#include <cstdint>
#include <span>

namespace millpond {

/// What a packet of this stream looks like.
struct RtpExpectation {
    std::uint8_t payload_type = 96;
    std::uint8_t send_time_id = 0; ///< header extension that carries the NTP-64 time (RFC 6051); 0: none
};

struct RtpPacket {
    bool marker = false;
    std::uint8_t payload_type = 0;
    std::uint16_t sequence = 0;
    std::uint32_t timestamp = 0; ///< of the payload's first frame, counted in frames from a random start
    std::uint32_t ssrc = 0;
    std::uint64_t send_time_ntp = 0;       ///< 0 where the packet carries none
    std::span<const std::uint8_t> payload; ///< into the bytes parsed; padding is cut off
};

/// PacketCause::accepted and a filled `packet`, or why not: wrong_version, truncated, wrong_payload_type.
/// Extensions other than the one expected, and broken ones, are passed over: their frames are good.
PacketCause parse_rtp(std::span<const std::uint8_t> bytes, const RtpExpectation& expected, RtpPacket& packet) noexcept;

/// Bytes that write_rtp_header writes.
constexpr std::size_t rtp_header_bytes(bool with_send_time) noexcept {
    return with_send_time ? 12 + 4 + 12 : 12;
}

/// Writes the header, with `packet.send_time_ntp` as a one-byte-header extension where `send_time_id` is 1 to 14 and
/// without extension where it is 0. Returns the bytes written; the payload goes behind them.
std::size_t write_rtp_header(const RtpPacket& packet, std::uint8_t send_time_id,
                             std::span<std::uint8_t> bytes) noexcept;

} // namespace millpond
