// The command `feed` as a user runs it, into an RtpSource made from the description that it writes.
#include "base/clock.hpp"
#include "intake/rtp_source.hpp"
#include "intake/sdp.hpp"
#include "packets.hpp"
#include "support/files.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

#include <bit>
#include <csignal>
#include <optional>

namespace millpond {
namespace {

using namespace test;
using std::chrono::milliseconds;
using std::chrono::seconds;

void put(std::string& out, std::uint32_t value, int bytes) {
    for (int i = 0; i < bytes; ++i) {
        out.push_back(static_cast<char>((value >> (8 * i)) & 0xff));
    }
}

/// A RIFF WAVE file of 32-bit floats (format tag 3), two channels at 1250 Hz.
std::string float_wav(const std::vector<float>& samples) {
    const auto bytes = static_cast<std::uint32_t>(samples.size() * 4);
    std::string wav = "RIFF";
    put(wav, 36 + bytes, 4);
    wav += "WAVEfmt ";
    put(wav, 16, 4);
    put(wav, 3, 2);
    put(wav, 2, 2);
    put(wav, 1250, 4);
    put(wav, 10000, 4);
    put(wav, 8, 2);
    put(wav, 32, 2);
    wav += "data";
    put(wav, bytes, 4);
    for (const float sample : samples) {
        put(wav, std::bit_cast<std::uint32_t>(sample), 4);
    }
    return wav;
}

class FeedCommand : public ::testing::Test {
  protected:
    FeedCommand() {
        for (int i = 0; i < 2 * 1250; ++i) {
            samples_.push_back(static_cast<float>(i * 37 % 20001 - 10000) * 0.1F);
        }
        static_cast<void>(folder_.file("in.wav", float_wav(samples_)));
        settings_.microvolts_per_count = 0.1;
        settings_.send_time_extension = 1;
    }

    [[nodiscard]] std::string path(const std::string& name) const { return (folder_ / name).string(); }
    [[nodiscard]] std::string to() const { return "127.0.0.1:" + std::to_string(settings_.port); }

    void start(const std::vector<std::string>& options) {
        std::vector<std::string> words{MILLPOND_PROGRAM, "feed", path("in.wav"), "--to", to()};
        words.insert(words.end(), options.begin(), options.end());
        feed_.emplace(std::move(words), folder_ / "feed");
    }

    int end() { return feed_->status(); }

    [[nodiscard]] std::string told() const { return feed_->out(); }

    /// All blocks up to `frames`, one after the other; checks that none is missing.
    std::vector<float> receive(RtpSource& source, std::size_t frames) {
        std::vector<float> all;
        const auto until = monotonic_now() + seconds{20};
        for (Arrival arrival; all.size() < 2 * frames && monotonic_now() < until;) {
            if (source.receive(milliseconds{50}, arrival) == Received::frames) {
                EXPECT_EQ(arrival.block.first.value, all.size() / 2);
                EXPECT_NE(arrival.sent_ns, 0);
                all.insert(all.end(), arrival.block.data.begin(), arrival.block.data.end());
            }
        }
        return all;
    }

    TemporaryFolder folder_;
    std::vector<float> samples_;
    StreamSettings settings_ = two_channels();
    std::optional<Process> feed_;
};

TEST_F(FeedCommand, EverySampleArrivesAsTheSameBits) {
    RtpSource source(settings_);
    start({"--speed", "5", "--write-sdp", path("out.sdp")});
    EXPECT_EQ(receive(source, 1250), samples_);
    EXPECT_EQ(end(), 0);
    EXPECT_EQ(read_sdp_file(path("out.sdp")),
              (SdpStream{"127.0.0.1", settings_.port, 96, SampleEncoding::l16, 1250, 2, 1}));
    EXPECT_EQ(told().find("sent 1250 frames (1.000 s) in 1250 packets; "), 0U) << told();
}

TEST_F(FeedCommand, AtRealPaceNoPacketComesBeforeItsTime) {
    RtpSource source(settings_);
    const auto begin = monotonic_now();
    start({"--packet-ms", "20", "--duration-s", "0.4"});
    receive(source, 500);
    EXPECT_GE(monotonic_now() - begin, milliseconds{400});
    EXPECT_EQ(end(), 0);
    EXPECT_EQ(told().find("v=0"), 0U) << "without --write-sdp the description is printed";
}

TEST_F(FeedCommand, AStretchIsSentAgainAndAgainUntilInterrupted) {
    RtpSource source(settings_);
    start({"--loop", "--from-s", "0.5", "--duration-s", "0.2", "--speed", "10"});
    const auto received = receive(source, 600);
    feed_->send(SIGINT);
    EXPECT_EQ(end(), 0);
    ASSERT_GE(received.size(), 1200U);
    for (std::size_t i = 0; i < 1200; ++i) {
        ASSERT_EQ(received[i], samples_[2 * 625 + i % 500]) << i;
    }
    EXPECT_NE(told().find("sent "), std::string::npos) << "the report comes after an interruption, too";
}

TEST_F(FeedCommand, ClippedSamplesAreReported) {
    RtpSource source(settings_);
    start({"--microvolts-per-count", "0.01", "--speed", "100"});
    EXPECT_EQ(end(), 0);
    EXPECT_NE(told().find("clipped "), std::string::npos) << told();
}

TEST_F(FeedCommand, OtherHostsAreRefusedWithoutTheirOwnWord) {
    const auto feed = [this](const std::string& options) {
        return run_millpond("feed " + path("in.wav") + " " + options);
    };
    const auto other = feed("--to 192.0.2.1:5004");
    EXPECT_EQ(other.status, 2);
    EXPECT_NE(other.err.find("--to: found 192.0.2.1:5004; allowed: 127.0.0.1:PORT, or --allow-other-hosts"),
              std::string::npos)
        << other.err;
    for (const std::string wrong : {"127.0.0.1", "127.0.0.1:0", "127.0.0.1:70000", "localhost:5004", ":5004"}) {
        EXPECT_EQ(feed("--to " + wrong).status, 2) << wrong;
    }
    EXPECT_EQ(feed("--from-s 2").status, 2) << "the recording has one second";
    EXPECT_EQ(feed("--write-sdp /nowhere/out.sdp").status, 2);
}

} // namespace
} // namespace millpond
