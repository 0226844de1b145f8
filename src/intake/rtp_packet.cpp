#include "intake/rtp_packet.hpp"

#include <algorithm>
#include <cassert>

namespace millpond {
namespace {

using Bytes = std::span<const std::uint8_t>;

constexpr std::size_t fixed_header_bytes = 12;
constexpr std::size_t ntp_bytes = 8;
constexpr std::uint16_t one_byte_profile = 0xBEDE; // RFC 8285, 4.2
constexpr std::uint16_t two_byte_profile = 0x1000; // RFC 8285, 4.3: the low four bits are the application's
constexpr std::uint16_t two_byte_profile_mask = 0xFFF0;

template <class Whole> Whole read_big_endian(Bytes bytes, std::size_t at) noexcept {
    Whole value = 0;
    for (std::size_t i = 0; i < sizeof(Whole); ++i) {
        value = static_cast<Whole>((value << 8) | bytes[at + i]);
    }
    return value;
}

template <class Whole> void write_big_endian(std::span<std::uint8_t> bytes, std::size_t at, Whole value) noexcept {
    for (std::size_t i = 0; i < sizeof(Whole); ++i) {
        bytes[at + i] = static_cast<std::uint8_t>(value >> (8 * (sizeof(Whole) - 1 - i)));
    }
}

struct Element {
    std::uint8_t id;
    std::size_t header, length;
};

Element one_byte_element(Bytes bytes, std::size_t at) noexcept {
    return {static_cast<std::uint8_t>(bytes[at] >> 4), 1, (bytes[at] & 0x0fU) + 1U};
}

Element two_byte_element(Bytes bytes, std::size_t at) noexcept {
    return {bytes[at], 2, at + 1 < bytes.size() ? std::size_t{bytes[at + 1]} : bytes.size()};
}

std::uint64_t find_send_time(std::uint16_t profile, Bytes elements, std::uint8_t id) noexcept {
    const bool one_byte = profile == one_byte_profile;
    if (id == 0 || (!one_byte && (profile & two_byte_profile_mask) != two_byte_profile)) {
        return 0;
    }
    std::size_t at = 0;
    while (at < elements.size()) {
        if (elements[at] == 0) { // a padding byte
            ++at;
            continue;
        }
        const auto element = one_byte ? one_byte_element(elements, at) : two_byte_element(elements, at);
        if (one_byte && element.id == 15) { // RFC 8285, 4.2: stop here
            return 0;
        }
        at += element.header;
        if (element.length > elements.size() - std::min(at, elements.size())) {
            return 0;
        }
        if (element.id == id && element.length == ntp_bytes) {
            return read_big_endian<std::uint64_t>(elements, at);
        }
        at += element.length;
    }
    return 0;
}

/// Moves `at` behind the extension; false where it is longer than the packet.
bool read_extension(Bytes bytes, std::uint8_t id, std::size_t& at, RtpPacket& packet) noexcept {
    if (bytes.size() < at + 4) {
        return false;
    }
    const auto profile = read_big_endian<std::uint16_t>(bytes, at);
    const std::size_t length = std::size_t{4} * read_big_endian<std::uint16_t>(bytes, at + 2);
    at += 4;
    if (bytes.size() < at + length) {
        return false;
    }
    packet.send_time_ntp = find_send_time(profile, bytes.subspan(at, length), id);
    at += length;
    return true;
}

} // namespace

PacketCause parse_rtp(Bytes bytes, const RtpExpectation& expected, RtpPacket& packet) noexcept {
    if (bytes.empty()) {
        return PacketCause::truncated;
    }
    if (bytes[0] >> 6 != 2) {
        return PacketCause::wrong_version;
    }
    if (bytes.size() < fixed_header_bytes) {
        return PacketCause::truncated;
    }
    packet.marker = (bytes[1] & 0x80U) != 0;
    packet.payload_type = bytes[1] & 0x7fU;
    if (packet.payload_type != expected.payload_type) {
        return PacketCause::wrong_payload_type;
    }
    packet.sequence = read_big_endian<std::uint16_t>(bytes, 2);
    packet.timestamp = read_big_endian<std::uint32_t>(bytes, 4);
    packet.ssrc = read_big_endian<std::uint32_t>(bytes, 8);
    packet.send_time_ntp = 0;
    std::size_t begin = fixed_header_bytes + std::size_t{4} * (bytes[0] & 0x0fU); // behind the CSRC list
    const bool extended = (bytes[0] & 0x10U) != 0;
    if (bytes.size() < begin || (extended && !read_extension(bytes, expected.send_time_id, begin, packet))) {
        return PacketCause::truncated;
    }
    std::size_t end = bytes.size();
    if ((bytes[0] & 0x20U) != 0) { // RFC 3550, 5.1: the last octet counts the padding, itself included
        const std::size_t padding = bytes[end - 1];
        if (padding == 0 || padding > end - begin) {
            return PacketCause::truncated;
        }
        end -= padding;
    }
    packet.payload = bytes.subspan(begin, end - begin);
    return PacketCause::accepted;
}

std::size_t write_rtp_header(const RtpPacket& packet, std::uint8_t send_time_id,
                             std::span<std::uint8_t> bytes) noexcept {
    const bool with_send_time = send_time_id != 0;
    assert(send_time_id < 15 && bytes.size() >= rtp_header_bytes(with_send_time));
    bytes[0] = with_send_time ? 0x90 : 0x80;
    bytes[1] = static_cast<std::uint8_t>((packet.marker ? 0x80U : 0U) | (packet.payload_type & 0x7fU));
    write_big_endian(bytes, 2, packet.sequence);
    write_big_endian(bytes, 4, packet.timestamp);
    write_big_endian(bytes, 8, packet.ssrc);
    if (with_send_time) {
        write_big_endian(bytes, 12, one_byte_profile);
        write_big_endian(bytes, 14, std::uint16_t{3}); // words: one header byte, eight of time, three of padding
        bytes[16] = static_cast<std::uint8_t>((std::size_t{send_time_id} << 4U) | (ntp_bytes - 1));
        write_big_endian(bytes, 17, packet.send_time_ntp);
        std::fill_n(bytes.begin() + 25, 3, std::uint8_t{0});
    }
    return rtp_header_bytes(with_send_time);
}

} // namespace millpond
