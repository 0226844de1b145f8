#include "intake/rtp_packet.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <vector>

namespace millpond {
namespace {

using Bytes = std::vector<std::uint8_t>;

// Layout of RFC 3550, 5.1: V=2 P X CC | M PT | sequence number | timestamp | SSRC | CSRC list.
Bytes plain() {
    return {0x80, 0xE1, 0x12, 0x34, 0xDE, 0xAD, 0xBE, 0xEF, 0xCA, 0xFE, 0xBA, 0xBE, 0x01, 0x02, 0x03, 0x04};
}

RtpPacket parsed(const Bytes& bytes, RtpExpectation expected = {97, 0}) {
    RtpPacket packet;
    EXPECT_EQ(parse_rtp(bytes, expected, packet), PacketCause::accepted);
    return packet;
}

PacketCause cause_of(const Bytes& bytes, RtpExpectation expected = {97, 0}) {
    RtpPacket packet;
    return parse_rtp(bytes, expected, packet);
}

Bytes payload_of(const RtpPacket& packet) {
    return {packet.payload.begin(), packet.payload.end()};
}

/// `plain` with the extension bit set and `extension` (profile, length in words, elements) before the payload.
Bytes extended(const Bytes& extension) {
    Bytes bytes = plain();
    bytes[0] |= 0x10;
    bytes.insert(bytes.begin() + 12, extension.begin(), extension.end());
    return bytes;
}

TEST(RtpPacket, FieldsStandWhereRfc3550FigureOfSection51PutsThem) {
    const auto bytes = plain();
    const auto packet = parsed(bytes);
    EXPECT_TRUE(packet.marker);
    EXPECT_EQ(packet.payload_type, 97);
    EXPECT_EQ(packet.sequence, 0x1234);
    EXPECT_EQ(packet.timestamp, 0xDEADBEEF);
    EXPECT_EQ(packet.ssrc, 0xCAFEBABE);
    EXPECT_EQ(packet.send_time_ntp, 0U);
    EXPECT_EQ(payload_of(packet), (Bytes{1, 2, 3, 4}));
}

TEST(RtpPacket, ContributingSourcesArePassedOver) {
    Bytes bytes = plain();
    bytes[0] = 0x82;
    bytes.insert(bytes.begin() + 12, 8, 0x55);
    EXPECT_EQ(payload_of(parsed(bytes)), (Bytes{1, 2, 3, 4}));
}

TEST(RtpPacket, PaddingIsCutOffByItsLastOctet) {
    Bytes bytes = plain();
    bytes[0] |= 0x20;
    bytes.insert(bytes.end(), {0, 0, 3});
    EXPECT_EQ(payload_of(parsed(bytes)), (Bytes{1, 2, 3, 4}));
}

TEST(RtpPacket, PaddingLongerThanThePayloadIsTruncated) {
    Bytes bytes = plain();
    bytes[0] |= 0x20;
    bytes.back() = 5;
    EXPECT_EQ(cause_of(bytes), PacketCause::truncated);
    bytes.back() = 0; // counts itself, so 0 cannot be
    EXPECT_EQ(cause_of(bytes), PacketCause::truncated);
}

TEST(RtpPacket, OtherVersionsAreCountedAsWrongVersion) {
    Bytes bytes = plain();
    bytes[0] = 0x40;
    EXPECT_EQ(cause_of(bytes), PacketCause::wrong_version);
    bytes[0] = 0xC0;
    EXPECT_EQ(cause_of(bytes), PacketCause::wrong_version);
}

TEST(RtpPacket, AnotherPayloadTypeIsCountedAsSuch) {
    EXPECT_EQ(cause_of(plain(), {96, 0}), PacketCause::wrong_payload_type);
}

TEST(RtpPacket, EveryPacketCutInsideItsHeadersIsTruncated) {
    Bytes whole = extended({0xBE, 0xDE, 0x00, 0x03, 0x57, 1, 2, 3, 4, 5, 6, 7, 8, 0, 0, 0});
    whole[0] |= 0x02;
    whole.insert(whole.begin() + 12, 8, 0x55);
    const std::size_t headers = whole.size() - 4;
    for (std::size_t size = 0; size < headers; ++size) {
        EXPECT_EQ(cause_of({whole.begin(), whole.begin() + static_cast<std::ptrdiff_t>(size)}), PacketCause::truncated)
            << size;
    }
    EXPECT_EQ(cause_of({whole.begin(), whole.begin() + static_cast<std::ptrdiff_t>(headers)}), PacketCause::accepted);
}

// RFC 8285, 4.2: 0xBEDE, length in words; each element 4 bits of ID, 4 bits of length less one. RFC 6051, 4: NTP-64.
TEST(RtpPacket, SendTimeIsReadFromAOneByteHeaderExtension) {
    const auto bytes = extended({0xBE, 0xDE, 0x00, 0x04,                // four words
                                 0x10, 0xAA,                            // ID 1, one byte
                                 0x00,                                  // padding
                                 0x57, 1,    2,    3,    4, 5, 6, 7, 8, // ID 5, eight bytes
                                 0x00, 0x00, 0x00, 0x00});
    EXPECT_EQ(parsed(bytes, {97, 5}).send_time_ntp, 0x0102030405060708U);
    EXPECT_EQ(payload_of(parsed(bytes, {97, 5})), (Bytes{1, 2, 3, 4}));
    EXPECT_EQ(parsed(bytes, {97, 0}).send_time_ntp, 0U) << "nobody said which ID it is";
    EXPECT_EQ(parsed(bytes, {97, 6}).send_time_ntp, 0U);
}

// RFC 8285, 4.3: 0x100 and four application bits; each element 8 bits of ID, 8 bits of length.
TEST(RtpPacket, SendTimeIsReadFromATwoByteHeaderExtension) {
    const auto bytes = extended({0x10, 0x03, 0x00, 0x04,                   // four words
                                 0x01, 0x00,                               // ID 1, empty
                                 0x00,                                     // padding
                                 0xC8, 0x08, 1,    2,    3, 4, 5, 6, 7, 8, // ID 200, eight bytes
                                 0x00, 0x00, 0x00});
    EXPECT_EQ(parsed(bytes, {97, 200}).send_time_ntp, 0x0102030405060708U);
}

TEST(RtpPacket, ElementIdFifteenEndsAOneByteExtension) {
    const auto bytes = extended({0xBE, 0xDE, 0x00, 0x03, 0xF0, 0x00, 0x57, 1, 2, 3, 4, 5, 6, 7, 8, 0});
    EXPECT_EQ(parsed(bytes, {97, 5}).send_time_ntp, 0U);
}

TEST(RtpPacket, ABrokenExtensionElementCostsTheSendTimeButNotTheSamples) {
    const auto bytes = extended({0xBE, 0xDE, 0x00, 0x01, 0x57, 1, 2, 3}); // says eight bytes, three are there
    EXPECT_EQ(parsed(bytes, {97, 5}).send_time_ntp, 0U);
    EXPECT_EQ(payload_of(parsed(bytes, {97, 5})), (Bytes{1, 2, 3, 4}));
    const auto two_byte = extended({0x10, 0x00, 0x00, 0x01, 0x00, 0x00, 0x00, 0x05}); // an ID without its length
    EXPECT_EQ(parsed(two_byte, {97, 5}).send_time_ntp, 0U);
}

TEST(RtpPacket, AnUnknownExtensionProfileIsPassedOver) {
    const auto bytes = extended({0x12, 0x34, 0x00, 0x01, 9, 9, 9, 9});
    EXPECT_EQ(payload_of(parsed(bytes, {97, 5})), (Bytes{1, 2, 3, 4}));
}

TEST(RtpPacket, AHeaderWrittenHereIsTheOneWrittenByHand) {
    RtpPacket packet;
    packet.marker = true;
    packet.payload_type = 97;
    packet.sequence = 0x1234;
    packet.timestamp = 0xDEADBEEF;
    packet.ssrc = 0xCAFEBABE;
    packet.send_time_ntp = 0x0102030405060708U;
    Bytes written(rtp_header_bytes(false));
    EXPECT_EQ(write_rtp_header(packet, 0, written), 12U);
    const Bytes by_hand = plain();
    EXPECT_TRUE(std::equal(written.begin(), written.end(), by_hand.begin()));

    Bytes with_time(rtp_header_bytes(true));
    EXPECT_EQ(write_rtp_header(packet, 5, with_time), 28U);
    const Bytes extension(with_time.begin() + 12, with_time.end());
    EXPECT_EQ(extension, (Bytes{0xBE, 0xDE, 0, 3, 0x57, 1, 2, 3, 4, 5, 6, 7, 8, 0, 0, 0}));
    EXPECT_EQ(parsed(with_time, {97, 5}).send_time_ntp, packet.send_time_ntp);
}

} // namespace
} // namespace millpond
