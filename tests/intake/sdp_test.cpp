#include "base/refusal.hpp"
#include "intake/sdp.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

std::string refusal_of(const std::string& text) {
    try {
        static_cast<void>(parse_sdp(text, "rig.sdp"));
    } catch (const Refusal& refusal) {
        return refusal.what();
    }
    return "taken";
}

// What ffmpeg 5.1 wrote for -c:a pcm_s16be at 1250 Hz, stereo.
constexpr const char* from_ffmpeg = "v=0\r\n"
                                    "o=- 0 0 IN IP4 127.0.0.1\r\n"
                                    "s=No Name\r\n"
                                    "c=IN IP4 127.0.0.1\r\n"
                                    "t=0 0\r\n"
                                    "a=tool:libavformat LIBAVFORMAT_VERSION\r\n"
                                    "m=audio 5999 RTP/AVP 97\r\n"
                                    "b=AS:40\r\n"
                                    "a=rtpmap:97 L16/1250/2\r\n";

TEST(Sdp, WhatFfmpegWritesIsTakenAsItIs) {
    EXPECT_EQ(parse_sdp(from_ffmpeg, "rig.sdp"), (SdpStream{"127.0.0.1", 5999, 97, SampleEncoding::l16, 1250, 2, 0}));
}

TEST(Sdp, WhatFfmpegPrintsHasAHeadingThatIsPassedOver) {
    EXPECT_EQ(parse_sdp("SDP:\n" + std::string(from_ffmpeg) + "\n", "rig.sdp"), parse_sdp(from_ffmpeg, "rig.sdp"));
}

const std::string head = "v=0\no=- 0 0 IN IP4 10.0.0.1\ns=-\nc=IN IP4 10.0.0.1\nt=0 0\n";

// RFC 3551, table 4: 10 is L16, 44100 Hz, 2 channels; 11 is L16, 44100 Hz, 1 channel.
TEST(Sdp, StaticPayloadTypesNeedNoRtpmap) {
    EXPECT_EQ(parse_sdp(head + "m=audio 5004 RTP/AVP 10\n", "x"),
              (SdpStream{"10.0.0.1", 5004, 10, SampleEncoding::l16, 44100, 2, 0}));
    EXPECT_EQ(parse_sdp(head + "m=audio 5004 RTP/AVP 11\n", "x"),
              (SdpStream{"10.0.0.1", 5004, 11, SampleEncoding::l16, 44100, 1, 0}));
}

TEST(Sdp, ChannelsAreOneWhereTheRtpmapSaysNone) {
    const auto stream = parse_sdp(head + "m=audio 5004 RTP/AVP 98\na=rtpmap:98 l24/30000\n", "x");
    EXPECT_EQ(stream.channels, 1U);
    EXPECT_EQ(stream.encoding, SampleEncoding::l24);
    EXPECT_EQ(stream.rate_hz, 30000U);
}

TEST(Sdp, TheFirstPayloadTypeThatCanBeTakenIsTaken) {
    const auto stream =
        parse_sdp(head + "m=audio 5004 RTP/AVP 0 99 98\na=rtpmap:99 opus/48000/2\na=rtpmap:98 L16/1250/8\n", "x");
    EXPECT_EQ(stream.payload_type, 98);
    EXPECT_EQ(stream.channels, 8U);
}

TEST(Sdp, TheAddressOfTheMediaPartStandsAboveThatOfTheSession) {
    EXPECT_EQ(parse_sdp(head + "m=audio 5004 RTP/AVP 11\nc=IN IP4 127.0.0.2\n", "x").address, "127.0.0.2");
}

TEST(Sdp, SendTimeExtensionIsReadFromItsExtmap) {
    const auto with = [](const std::string& id) {
        return head + "m=audio 5004 RTP/AVP 11\na=extmap:" + id + " urn:ietf:params:rtp-hdrext:ntp-64\n";
    };
    EXPECT_EQ(parse_sdp(with("3"), "x").send_time_id, 3);
    EXPECT_EQ(parse_sdp(with("200/sendonly"), "x").send_time_id, 200);
    EXPECT_NE(refusal_of(with("15")).find("rig.sdp:7: found '15'"), std::string::npos);
    EXPECT_EQ(
        parse_sdp(head + "m=audio 5004 RTP/AVP 11\na=extmap:3 urn:ietf:params:rtp-hdrext:toffset\n", "x").send_time_id,
        0);
}

TEST(Sdp, RefusalsNameTheLineAndWhatIsAllowed) {
    EXPECT_EQ(refusal_of("hello\n"), "rig.sdp:1: found 'hello'; allowed: lines of the form type=value");
    EXPECT_EQ(refusal_of(""), "rig.sdp:1: found no v=0; allowed: a session description, which begins with v=0");
    EXPECT_EQ(refusal_of("o=- 0 0 IN IP4 10.0.0.1\n").substr(0, 25), "rig.sdp:1: found no v=0; ");
    EXPECT_EQ(refusal_of(head).substr(0, 24), "rig.sdp: found no m= lin");
    EXPECT_EQ(refusal_of(head + "m=audio 5004 RTP/AVP 11\nm=video 5006 RTP/AVP 31\n").substr(0, 38),
              "rig.sdp:7: found a second m= line; all");
    for (const std::string media : {"video 5004 RTP/AVP 31", "audio 5004 RTP/SAVP 11", "audio 5004 RTP/AVP", "audio"}) {
        EXPECT_EQ(refusal_of(head + "m=" + media + "\n").substr(0, 19 + media.size()),
                  "rig.sdp:6: found '" + media + "'");
    }
    EXPECT_EQ(refusal_of(head + "m=audio 70000 RTP/AVP 11\n").substr(0, 31), "rig.sdp:6: found port '70000'; ");
    EXPECT_EQ(refusal_of(head + "m=audio 5004 RTP/AVP 128\n").substr(0, 36), "rig.sdp:6: found payload type '128';");
    EXPECT_EQ(refusal_of(head + "m=audio 5004 RTP/AVP 97\n").substr(0, 18), "rig.sdp:6: found '");
    EXPECT_EQ(refusal_of(head + "m=audio 5004 RTP/AVP 97\na=rtpmap:97 L16/1250/300\n").substr(0, 16),
              "rig.sdp:7: found");
    EXPECT_EQ(refusal_of(head + "m=audio 5004 RTP/AVP 97\na=rtpmap:97 L20/1250/2\n").substr(0, 16), "rig.sdp:6: found");
}

TEST(Sdp, AddressesThatCannotBeListenedOnAreRefused) {
    for (const std::string connection :
         {"IN IP6 ::1", "IN IP4 239.1.2.3/127", "IN IP4 239.1.2.3", "IN IP4 rig.local"}) {
        const auto refusal = refusal_of("v=0\nc=" + connection + "\nm=audio 5004 RTP/AVP 11\n");
        EXPECT_EQ(refusal.substr(0, 19 + connection.size()), "rig.sdp:2: found '" + connection + "'") << refusal;
    }
    EXPECT_EQ(refusal_of("v=0\nm=audio 5004 RTP/AVP 11\n").substr(0, 29), "rig.sdp:2: found no c= line; ");
}

TEST(Sdp, WhatIsWrittenReadsBack) {
    const SdpStream stream{"127.0.0.1", 5004, 96, SampleEncoding::l24, 30000, 64, 1};
    const auto text = write_sdp(stream, "invented", "0.1 uV per count");
    EXPECT_EQ(parse_sdp(text, "x"), stream);
    EXPECT_NE(text.find("i=0.1 uV per count\r\n"), std::string::npos);
}

} // namespace
} // namespace millpond
