// The session description (SDP, RFC 8866) of one RTP stream of samples, read and written.
// Thread: control. What cannot be taken throws Refusal naming file and line.
#pragma once

#include "intake/sample_format.hpp"

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <string>
#include <string_view>

namespace millpond {

inline constexpr std::string_view ntp64_extension_uri = "urn:ietf:params:rtp-hdrext:ntp-64"; // RFC 6051

struct SdpStream {
    std::string address; ///< dotted IPv4 address that the packets are sent to
    std::uint16_t port = 0;
    std::uint8_t payload_type = 0;
    SampleEncoding encoding = SampleEncoding::l16; ///< l16 or l24
    std::uint32_t rate_hz = 0;
    std::size_t channels = 1;
    std::uint8_t send_time_id = 0; ///< header extension with the NTP-64 time; 0: none

    bool operator==(const SdpStream&) const = default;
};

/// Takes a description with exactly one m= line, of audio by RTP/AVP in L16 or L24: dynamic payload types with their
/// rtpmap, or the static 10 and 11 of RFC 3551. Lines that say nothing about the samples are passed over, and so is the
/// `SDP:` that ffmpeg prints above. `name` is the file's name for refusals.
[[nodiscard]] SdpStream parse_sdp(std::string_view text, const std::string& name);

[[nodiscard]] SdpStream read_sdp_file(const std::filesystem::path& file);

/// `information` is one line for people (i=), left out where empty.
[[nodiscard]] std::string write_sdp(const SdpStream& stream, std::string_view session_name,
                                    std::string_view information);

} // namespace millpond
