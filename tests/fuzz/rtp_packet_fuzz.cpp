// Any bytes as an RTP packet: never read outside them, and what is accepted lies within them.
#include "intake/rtp_packet.hpp"

#include <cstddef>
#include <cstdint>
#include <cstdlib>

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    if (size < 1) {
        return 0;
    }
    const millpond::RtpExpectation expected{static_cast<std::uint8_t>(size > 2 ? data[2] & 0x7fU : 96U), data[0]};
    const std::span<const std::uint8_t> bytes(data + 1, size - 1);
    millpond::RtpPacket packet;
    if (parse_rtp(bytes, expected, packet) == millpond::PacketCause::accepted) {
        const auto begin = packet.payload.data() - bytes.data();
        if (begin < 12 || static_cast<std::size_t>(begin) + packet.payload.size() > bytes.size()) {
            std::abort();
        }
    }
    return 0;
}
