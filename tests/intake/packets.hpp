// Packets, ports and sockets for the tests of intake.
#pragma once

#include "intake/rtp_packet.hpp"
#include "intake/stream_settings.hpp"
#include "support/udp_port.hpp"

#include <boost/asio/buffer.hpp>
#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <cstdint>
#include <vector>

namespace millpond::test {

using Bytes = std::vector<std::uint8_t>;

struct PacketParts {
    std::uint16_t sequence = 0;
    std::uint32_t timestamp = 0;
    std::uint32_t ssrc = 7;
    std::uint8_t payload_type = 96;
    std::uint64_t send_time_ntp = 0;
    std::uint8_t send_time_id = 0;
};

/// An L16 packet holding `counts`.
inline Bytes l16_packet(const PacketParts& parts, const std::vector<std::int16_t>& counts) {
    RtpPacket packet;
    packet.sequence = parts.sequence;
    packet.timestamp = parts.timestamp;
    packet.ssrc = parts.ssrc;
    packet.payload_type = parts.payload_type;
    packet.send_time_ntp = parts.send_time_ntp;
    Bytes bytes(rtp_header_bytes(parts.send_time_id != 0));
    write_rtp_header(packet, parts.send_time_id, bytes);
    for (const auto count : counts) {
        bytes.push_back(static_cast<std::uint8_t>(static_cast<std::uint16_t>(count) >> 8));
        bytes.push_back(static_cast<std::uint8_t>(count & 0xff));
    }
    return bytes;
}

/// Two channels of L16 at 1250 Hz, one count 0.5 uV, on a free port: all resolved.
inline StreamSettings two_channels() {
    StreamSettings settings;
    settings.port = free_udp_port();
    settings.encoding = SampleEncoding::l16;
    settings.rate_hz = 1250.0;
    settings.channels = 2;
    settings.microvolts_per_count = 0.5;
    return resolved(settings, "test.yaml");
}

class UdpSender {
  public:
    explicit UdpSender(std::uint16_t port) : to_(boost::asio::ip::address_v4::loopback(), port) {
        socket_.open(boost::asio::ip::udp::v4());
    }
    void send(const Bytes& bytes) { socket_.send_to(boost::asio::buffer(bytes), to_); }

  private:
    boost::asio::io_context context_;
    boost::asio::ip::udp::socket socket_{context_};
    boost::asio::ip::udp::endpoint to_;
};

} // namespace millpond::test
