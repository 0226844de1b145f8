// ffmpeg as the sender: a program that nobody here wrote, sending L16 and L24 of files written here.
#include "base/clock.hpp"
#include "intake/rtp_source.hpp"
#include "intake/sdp.hpp"
#include "packets.hpp"
#include "support/files.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

#include <filesystem>
#include <fstream>
#include <optional>
#include <thread>

namespace millpond {
namespace {

using namespace test;
using std::chrono::milliseconds;
using std::chrono::seconds;

void put(std::ofstream& out, std::uint32_t value, int bytes) {
    for (int i = 0; i < bytes; ++i) {
        out.put(static_cast<char>((value >> (8 * i)) & 0xff));
    }
}

std::int16_t count_at(std::size_t index) {
    return static_cast<std::int16_t>(static_cast<std::uint16_t>(index * 40503U)); // visits every count, ends included
}

/// A canonical RIFF WAVE file of 16-bit samples.
void write_wav(const std::filesystem::path& file, std::uint32_t rate, std::uint16_t channels, std::size_t frames) {
    std::ofstream out(file, std::ios::binary);
    const auto bytes = static_cast<std::uint32_t>(frames * channels * 2);
    out << "RIFF";
    put(out, 36 + bytes, 4);
    out << "WAVEfmt ";
    put(out, 16, 4);
    put(out, 1, 2);
    put(out, channels, 2);
    put(out, rate, 4);
    put(out, rate * channels * 2, 4);
    put(out, channels * 2U, 2);
    put(out, 16, 2);
    out << "data";
    put(out, bytes, 4);
    for (std::size_t i = 0; i < frames * channels; ++i) {
        put(out, static_cast<std::uint16_t>(count_at(i)), 2);
    }
}

class Ffmpeg : public ::testing::Test {
  protected:
    void SetUp() override {
        if (!has_program("ffmpeg") || !has_program("ffprobe")) {
            GTEST_SKIP() << "NOT CHECKED against ffmpeg: it is not installed";
        }
    }

    void start(const std::vector<std::string>& arguments) {
        std::vector<std::string> words{"ffmpeg", "-hide_banner", "-loglevel", "error", "-nostdin"};
        words.insert(words.end(), arguments.begin(), arguments.end());
        sender_.emplace(std::move(words), folder_ / "ffmpeg");
    }

    std::string name(const char* file) const { return (folder_ / file).string(); }

    /// Streams the file twice: once for its SDP alone, then into a source made from that SDP.
    void stream_and_compare(const std::string& codec, std::uint32_t rate, std::uint16_t channels, std::size_t frames) {
        write_wav(name("in.wav"), rate, channels, frames);
        const auto to = "rtp://127.0.0.1:" + std::to_string(free_udp_port());
        start({"-i", name("in.wav"), "-c:a", codec, "-f", "rtp", "-sdp_file", name("rig.sdp"), to});
        ASSERT_EQ(sender_->status(), 0) << sender_->err();

        StreamSettings settings;
        settings.sdp_file = "rig.sdp";
        settings.microvolts_per_count = codec == "pcm_s24be" ? 0.5 / 256 : 0.5; // ffmpeg widens by eight zero bits
        RtpSource source(resolved(settings, folder_ / "rig.yaml"));
        EXPECT_EQ(source.rate().value, rate);
        ASSERT_EQ(source.channels(), channels);
        start({"-re", "-i", name("in.wav"), "-c:a", codec, "-f", "rtp", to});

        std::size_t place = 0;
        Arrival arrival;
        const auto until = monotonic_now() + seconds{20};
        while (place < frames && monotonic_now() < until) {
            if (source.receive(milliseconds{100}, arrival) != Received::frames) {
                continue;
            }
            ASSERT_EQ(arrival.block.first, SampleIndex{place});
            for (std::size_t i = 0; i < arrival.block.data.size(); ++i) {
                ASSERT_EQ(arrival.block.data[i], static_cast<float>(count_at(place * channels + i)) * 0.5F) << place;
            }
            place += arrival.block.frames();
        }
        EXPECT_EQ(place, frames);
    }

    TemporaryFolder folder_;
    std::optional<Process> sender_;
};

TEST_F(Ffmpeg, L16AtAnLfpRateArrivesSampleForSample) {
    stream_and_compare("pcm_s16be", 1250, 2, 1500);
}

TEST_F(Ffmpeg, L24OfEightChannelsArrivesSampleForSample) {
    stream_and_compare("pcm_s24be", 30000, 8, 20000);
}

TEST_F(Ffmpeg, StaticPayloadTypeOfL16At44100HzArrivesSampleForSample) {
    stream_and_compare("pcm_s16be", 44100, 2, 30000);
}

// And the other way: ffmpeg reads the description written here and knows the same stream in it.
TEST_F(Ffmpeg, TheDescriptionWrittenHereIsReadByFfprobe) {
    const SdpStream stream{"127.0.0.1", free_udp_port(), 96, SampleEncoding::l16, 1250, 4, 1};
    std::ofstream(name("ours.sdp")) << write_sdp(stream, "invented", "0.1 uV per count");
    Process probe({"ffprobe", "-v", "error", "-protocol_whitelist", "file,udp,rtp", "-show_entries",
                   "stream=codec_name,sample_rate,channels", "-of", "csv=p=0", "-analyzeduration", "1", "-i",
                   name("ours.sdp")},
                  folder_ / "ffprobe");
    UdpSender sender(stream.port);
    const auto until = monotonic_now() + seconds{10};
    for (std::uint16_t i = 0; probe.out().find('\n') == std::string::npos && monotonic_now() < until; ++i) {
        sender.send(l16_packet({i, i * 10U}, std::vector<std::int16_t>(40)));
        std::this_thread::sleep_for(milliseconds{5});
    }
    EXPECT_EQ(probe.out(), "pcm_s16be,1250,4\n") << probe.err();
}

} // namespace
} // namespace millpond
