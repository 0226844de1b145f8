#include "base/refusal.hpp"
#include "intake/stream_settings.hpp"
#include "settings/yaml_reader.hpp"
#include "support/files.hpp"

#include <gtest/gtest.h>

#include <filesystem>
#include <fstream>

namespace millpond {
namespace {

class StreamSettingsFile : public ::testing::Test {
  protected:
    void SetUp() override {
        std::ofstream(folder_ / "rig.sdp") << "v=0\ns=-\nc=IN IP4 127.0.0.1\nm=audio 5999 RTP/AVP 97\n"
                                              "a=rtpmap:97 L24/1250/8\na=extmap:2 urn:ietf:params:rtp-hdrext:ntp-64\n";
    }

    [[nodiscard]] StreamSettings read(const std::string& text) const {
        const auto file = folder_ / "rig.yaml";
        std::ofstream(file) << text;
        return resolved(read_yaml_file<StreamSettings>(file), file);
    }

    [[nodiscard]] std::string refusal_of(const std::string& text) const {
        try {
            static_cast<void>(read(text));
        } catch (const Refusal& refusal) {
            const std::string line = refusal.what();
            return line.substr(line.find("rig."));
        }
        return "taken";
    }

    test::TemporaryFolder folder_;
};

TEST_F(StreamSettingsFile, TheSdpFileBesideItSaysWhatTheSettingsDoNot) {
    const auto stream = read("{sdp_file: rig.sdp, microvolts_per_count: 0.1}");
    EXPECT_EQ(stream.listen_address, "127.0.0.1");
    EXPECT_EQ(stream.port, 5999);
    EXPECT_EQ(stream.payload_type, 97);
    EXPECT_EQ(stream.encoding, SampleEncoding::l24);
    EXPECT_EQ(stream.rate_hz, 1250.0);
    EXPECT_EQ(stream.channels, 8U);
    EXPECT_EQ(stream.send_time_extension, 2);
}

TEST_F(StreamSettingsFile, AContradictionToTheSdpFileIsRefusedKeyByKey) {
    for (const std::string contradiction :
         {"listen_address: 127.0.0.2", "port: 5998", "payload_type: 96", "encoding: L16", "rate_hz: 1000",
          "channels: 2", "send_time_extension: 3"}) {
        const auto key = contradiction.substr(0, contradiction.find(':'));
        const auto refusal = refusal_of("{sdp_file: rig.sdp, microvolts_per_count: 0.1, " + contradiction + "}");
        EXPECT_EQ(refusal.find("rig.yaml: stream." + key + ": found "), 0U) << refusal;
        EXPECT_NE(refusal.find("as rig.sdp says"), std::string::npos) << refusal;
    }
    EXPECT_EQ(read("{sdp_file: rig.sdp, microvolts_per_count: 0.1, port: 5999, channels: 8}").port, 5999);
}

TEST_F(StreamSettingsFile, WhatIsResolvedStaysAsItIs) {
    const auto once = read("{sdp_file: rig.sdp, microvolts_per_count: 0.1}");
    EXPECT_EQ(resolved(once, folder_ / "rig.yaml"), once);
}

TEST_F(StreamSettingsFile, AStreamWithoutSdpFileNeedsPortEncodingRateChannelsAndScale) {
    const std::string all[] = {"port: 5004", "encoding: L16", "rate_hz: 1250", "channels: 2",
                               "microvolts_per_count: 0.1"};
    for (const auto& missing : all) {
        std::string text = "{stale_after_ms: 100";
        for (const auto& given : all) {
            text += &given == &missing ? "" : ", " + given;
        }
        const auto key = missing.substr(0, missing.find(':'));
        EXPECT_EQ(refusal_of(text + "}").find("rig.yaml: stream." + key + ": found "), 0U) << refusal_of(text + "}");
    }
    const auto stream = read("{port: 5004, encoding: L16, rate_hz: 1250, channels: 2, microvolts_per_count: 0.1}");
    EXPECT_EQ(stream.listen_address, "127.0.0.1");
    EXPECT_EQ(stream.payload_type, 96);
}

TEST_F(StreamSettingsFile, OtherHostsNeedTheirOwnWord) {
    const std::string rest = "port: 5004, encoding: L16, rate_hz: 1250, channels: 2, microvolts_per_count: 0.1}";
    for (const std::string address : {"0.0.0.0", "192.168.7.1"}) {
        EXPECT_EQ(refusal_of("{listen_address: " + address + ", " + rest)
                      .find("rig.yaml: stream.listen_address: found " + address),
                  0U);
        EXPECT_EQ(read("{allow_other_hosts: true, listen_address: " + address + ", " + rest).listen_address, address);
    }
    EXPECT_EQ(
        refusal_of("{listen_address: localhost, " + rest).find("rig.yaml: stream.listen_address: found 'localhost'"),
        0U);
}

TEST_F(StreamSettingsFile, APipeTakesItsOwnEncodingsAndNoSdpFile) {
    const auto stream = read("{source: pipe, encoding: float32, rate_hz: 1250, channels: 2}");
    EXPECT_EQ(stream.microvolts_per_count, 1.0) << "floats are microvolts already";
    EXPECT_EQ(refusal_of("{source: pipe, encoding: L16, rate_hz: 1250, channels: 2, microvolts_per_count: 1}")
                  .find("rig.yaml: stream.encoding: found L16; allowed: int16 or float32"),
              0U);
    EXPECT_EQ(refusal_of("{source: pipe, encoding: int16, rate_hz: 1250, channels: 2}")
                  .find("rig.yaml: stream.microvolts_per_count"),
              0U);
    EXPECT_EQ(refusal_of("{source: pipe, sdp_file: rig.sdp, encoding: float32, rate_hz: 1250, channels: 2}")
                  .find("rig.yaml: stream.sdp_file"),
              0U);
}

TEST_F(StreamSettingsFile, ABoardNeedsItsPathRateChannelsAndTheAmplifiersGain) {
    const std::string board = "source: daq, device: /dev/comedi0, rate_hz: 1250, channels: 2";
    const auto once = read("{" + board + ", gain: 1000}");
    EXPECT_EQ(resolved(once, folder_ / "rig.yaml"), once);
    EXPECT_EQ(refusal_of("{" + board + "}").find("rig.yaml: stream.gain: "), 0U);
    EXPECT_EQ(refusal_of("{source: daq, gain: 1, rate_hz: 1250, channels: 2}").find("rig.yaml: stream.device: "), 0U);
    EXPECT_EQ(refusal_of("{" + board + ", gain: 1, encoding: L16}").find("rig.yaml: stream.encoding: "), 0U);
    EXPECT_EQ(refusal_of("{" + board + ", gain: 1, microvolts_per_count: 0.2}")
                  .find("rig.yaml: stream.microvolts_per_count: "),
              0U);
    EXPECT_EQ(
        refusal_of("{source: daq, device: /dev/comedi0, gain: 1, channels: 2}").find("rig.yaml: stream.rate_hz: "), 0U);
}

} // namespace
} // namespace millpond
