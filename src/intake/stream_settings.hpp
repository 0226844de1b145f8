// What a user may say about where samples come from. Thread: control.
#pragma once

#include "base/describe.hpp"
#include "intake/sample_format.hpp"

#include <cstdint>
#include <filesystem>
#include <string>

namespace millpond {

enum class SourceKind : std::uint8_t {
    rtp,  ///< RTP packets by UDP
    pipe, ///< raw interleaved frames on standard input
    daq   ///< analogue input of a data acquisition board, through comedilib
};
inline constexpr Choice<SourceKind> source_kinds[] = {
    {SourceKind::rtp, "rtp"}, {SourceKind::pipe, "pipe"}, {SourceKind::daq, "daq"}};

/// Zeros, empty texts and from_sdp stand for `not said here`: the SDP file says it, or `resolved` fills it in.
struct StreamSettings {
    SourceKind source = SourceKind::rtp;
    std::string sdp_file;
    std::string listen_address;
    bool allow_other_hosts = false;
    std::uint16_t port = 0;
    std::uint8_t payload_type = 0;
    SampleEncoding encoding = SampleEncoding::from_sdp;
    double rate_hz = 0.0;
    std::uint32_t channels = 0;
    double microvolts_per_count = 0.0;
    std::uint8_t send_time_extension = 0;
    double reorder_wait_ms = 0.0;
    double restart_after_ms = 1000.0;
    double stale_after_ms = 500.0;
    std::uint32_t max_packet_bytes = 65535;
    std::uint32_t receive_buffer_bytes = 4'194'304;
    std::string device;
    std::uint32_t subdevice = 0;
    std::uint32_t range = 0;
    double gain = 0.0;

    bool operator==(const StreamSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, StreamSettings& stream) {
    visit.choice("source", stream.source, source_kinds,
                 "rtp: packets by UDP; pipe: raw frames on standard input; daq: a data acquisition board of comedi");
    visit.text("sdp_file", stream.sdp_file,
               "session description of the RTP stream, relative to this file; says address, port, payload type, "
               "encoding, rate and channels");
    visit.text("listen_address", stream.listen_address,
               "IPv4 address of this computer to listen on (rtp); empty: as the SDP file says, else 127.0.0.1");
    visit.flag("allow_other_hosts", stream.allow_other_hosts,
               "whether listen_address may be one that other computers can reach");
    visit.whole("port", stream.port, {0, 65535}, "UDP port to listen on (rtp); 0: as the SDP file says");
    visit.whole("payload_type", stream.payload_type, {0, 127}, "RTP payload type; 0: as the SDP file says, else 96");
    visit.choice("encoding", stream.encoding, sample_encodings,
                 "L16 or L24 (rtp), int16 or float32 (pipe); from_sdp: as the SDP file says");
    visit.number("rate_hz", stream.rate_hz, {0.0, 50000.0}, "frames a second, from 500; 0: as the SDP file says");
    visit.whole("channels", stream.channels, {0, 256}, "samples a frame; 0: as the SDP file says");
    visit.number("microvolts_per_count", stream.microvolts_per_count, {0.0, 1e6},
                 "what one count is worth; needed for integers; 0: samples are microvolts already (float32)");
    visit.whole("send_time_extension", stream.send_time_extension, {0, 255},
                "number of the RTP header extension with the NTP-64 send time; 0: as the SDP file says, else none");
    visit.number("reorder_wait_ms", stream.reorder_wait_ms, {0.0, 1000.0},
                 "how long packets wait for one that is missing before them; 0: never, latency first");
    visit.number("restart_after_ms", stream.restart_after_ms, {10.0, 60000.0},
                 "silence of the sender after which another is taken as its restart; also the greatest jump of its "
                 "timestamps against this computer's clock");
    visit.number("stale_after_ms", stream.stale_after_ms, {1.0, 60000.0},
                 "no packet for this long disarms the session; arm it again by command");
    visit.whole("max_packet_bytes", stream.max_packet_bytes, {64, 65535}, "longer packets are dropped as oversized");
    visit.whole("receive_buffer_bytes", stream.receive_buffer_bytes, {4096, 268435456},
                "what the kernel is asked to hold between two reads; it may grant less");
    visit.text("device", stream.device, "daq: path of the board, such as /dev/comedi0");
    visit.whole("subdevice", stream.subdevice, {0, 255}, "daq: number of the board's analogue input subdevice");
    visit.whole("range", stream.range, {0, 255}, "daq: number of the input range, as the board counts them");
    visit.number("gain", stream.gain, {0.0, 1e6},
                 "daq: gain of the amplifier before the board, needed for microvolts; 1: none");
}

/// Fills in what is not said, from the SDP file (relative to the folder of `settings_file`) and the defaults, so that
/// nothing is left open. Refuses what is missing, what contradicts the SDP file, what the source cannot deliver, and
/// addresses that other hosts can reach unless allow_other_hosts is set.
[[nodiscard]] StreamSettings resolved(StreamSettings settings, const std::filesystem::path& settings_file);

} // namespace millpond
