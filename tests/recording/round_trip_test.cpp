// What we write, we read back; what we write, sox and ffmpeg read.
#include "base/refusal.hpp"
#include "recording/recording_reader.hpp"
#include "recording/recording_writer.hpp"
#include "recording/whole_file.hpp"
#include "support/files.hpp"
#include "support/process.hpp"
#include "support/text.hpp"

#include <gtest/gtest.h>

#include <bit>
#include <cmath>
#include <csignal>
#include <cstring>
#include <sys/wait.h>
#include <unistd.h>

namespace millpond {
namespace {

using test::run;
using test::TemporaryFolder;

const Channels two_channels{{"CA1: 'deep'", ChannelRole::ripple}, {"cortex", ChannelRole::reference}};
constexpr double microvolts_per_count = 0.195;

/// Counts from end to end of the range, as a live packet would give them: one float multiplication each.
std::vector<float> counts_as_microvolts(int bits, std::size_t frames) {
    std::vector<float> data;
    const std::int64_t span = std::int64_t{1} << bits;
    for (std::size_t i = 0; i < 2 * frames; ++i) {
        const auto count = static_cast<std::int64_t>(i * 7919 * 104729) % span - span / 2;
        data.push_back(static_cast<float>(count) * static_cast<float>(microvolts_per_count));
    }
    data[0] = static_cast<float>(-span / 2) * static_cast<float>(microvolts_per_count);
    data[1] = static_cast<float>(span / 2 - 1) * static_cast<float>(microvolts_per_count);
    return data;
}

std::vector<float> some_floats(std::size_t frames) {
    std::vector<float> data;
    for (std::size_t i = 0; i < 2 * frames; ++i) {
        data.push_back(static_cast<float>(300.0 * std::sin(0.1 * static_cast<double>(i * i % 1000))));
    }
    return data;
}

std::filesystem::path write(const std::filesystem::path& file, Encoding encoding, const std::vector<float>& data,
                            double rate = 1250.0) {
    RecordingWriter writer(file, {container_for(file), encoding, microvolts_per_count, WriteMode::whole}, two_channels,
                           Hertz{rate});
    const std::span<const float> all(data);
    writer.write(all.first(2));
    writer.write(all.subspan(2));
    writer.finish();
    return file;
}

struct Kind {
    const char* ending;
    const char* format;
    Encoding encoding;
};
class EveryFormat : public ::testing::TestWithParam<Kind> {
  protected:
    [[nodiscard]] std::vector<float> data() const {
        const int bits = integer_bits(GetParam().encoding);
        return bits == 0 ? some_floats(30'000) : counts_as_microvolts(bits, 30'000);
    }
    TemporaryFolder scratch_;
};

TEST_P(EveryFormat, ComesBackBitForBit) {
    const auto file = write(scratch_ / (std::string("a") + GetParam().ending), GetParam().encoding, data());
    const auto back = load_recording(file);
    EXPECT_EQ(back.info.format, GetParam().format);
    EXPECT_EQ(back.info.rate.value, 1250.0);
    EXPECT_EQ(back.info.frames, 30'000u);
    EXPECT_EQ(back.info.channels, two_channels);
    if (GetParam().encoding == Encoding::int32) { // 32 bits do not fit a float's 24
        const auto written = data();
        ASSERT_EQ(back.data.size(), written.size());
        for (std::size_t i = 0; i < back.data.size(); ++i) {
            ASSERT_NEAR(back.data[i], written[i], std::abs(written[i]) * 2e-7f + 0.2f);
        }
    } else {
        EXPECT_EQ(back.data, data());
    }
}

TEST_P(EveryFormat, ReadsTheSameInPiecesOfAnySize) {
    const auto file = write(scratch_ / (std::string("a") + GetParam().ending), GetParam().encoding, data());
    const auto whole = load_recording(file);
    for (const std::size_t frames : {1u, 7u, 4096u, 100'000u}) {
        const auto reader = open_recording(file);
        std::vector<float> piece(2 * frames);
        std::vector<float> all;
        for (std::size_t got = frames; got == frames;) {
            got = reader->read(piece);
            all.insert(all.end(), piece.begin(), piece.begin() + static_cast<std::ptrdiff_t>(2 * got));
        }
        ASSERT_EQ(all, whole.data) << frames << " frames at a time";
    }
}

INSTANTIATE_TEST_SUITE_P(Recording, EveryFormat,
                         ::testing::Values(Kind{".wav", "WAV", Encoding::int16}, Kind{".wav", "WAV", Encoding::int24},
                                           Kind{".wav", "WAV", Encoding::int32}, Kind{".wav", "WAV", Encoding::float32},
                                           Kind{".rf64", "RF64", Encoding::int16},
                                           Kind{".rf64", "RF64", Encoding::float32},
                                           Kind{".w64", "W64", Encoding::int24}, Kind{".w64", "W64", Encoding::float32},
                                           Kind{".flac", "FLAC", Encoding::int16},
                                           Kind{".flac", "FLAC", Encoding::int24}, Kind{".raw", "raw", Encoding::int16},
                                           Kind{".raw", "raw", Encoding::int24}, Kind{".raw", "raw", Encoding::int32},
                                           Kind{".raw", "raw", Encoding::float32}));

TEST(RecordingWriter, SameSamplesGiveTheSameBytes) {
    TemporaryFolder scratch;
    const auto a = write(scratch / "a.wav", Encoding::float32, some_floats(1000));
    const auto b = write(scratch / "b.wav", Encoding::float32, some_floats(1000));
    EXPECT_EQ(read_whole_file(a), read_whole_file(b));
}

TEST(RecordingWriter, NonFiniteSamplesPassThroughFloatFiles) {
    TemporaryFolder scratch;
    const std::vector<float> data{1.0f, std::nanf(""), -INFINITY, INFINITY};
    for (const char* name : {"a.wav", "a.rf64", "a.w64", "a.raw"}) {
        const auto back = load_recording(write(scratch / name, Encoding::float32, data)).data;
        ASSERT_EQ(back.size(), 4u);
        EXPECT_TRUE(std::isnan(back[1])) << name;
        EXPECT_EQ(back[2], -INFINITY);
        EXPECT_EQ(back[3], INFINITY);
    }
}

TEST(RecordingWriter, IntegersRefuseNonFiniteSamplesAndLeaveNoFile) {
    TemporaryFolder scratch;
    EXPECT_THROW(write(scratch / "a.wav", Encoding::int16, {1.0f, 1.0f, std::nanf(""), 0.0f}), Refusal);
    EXPECT_FALSE(std::filesystem::exists(scratch / "a.wav"));
    EXPECT_FALSE(std::filesystem::exists(unfinished_path(scratch / "a.wav")));
}

TEST(RecordingWriter, CountsWhatItClips) {
    TemporaryFolder scratch;
    const auto file = scratch / "a.wav";
    RecordingWriter writer(file, {Container::wav, Encoding::int16, 1.0, WriteMode::whole}, two_channels, Hertz{1250.0});
    writer.write(std::vector<float>{32767.0f, 32768.0f, -32768.0f, -1e9f});
    EXPECT_EQ(writer.clipped(), 2u);
    EXPECT_EQ(writer.frames(), 2u);
    writer.finish();
    EXPECT_EQ(load_recording(file).data, (std::vector<float>{32767.0f, 32767.0f, -32768.0f, -32768.0f}));
}

TEST(RecordingWriter, RoundsToTheNearestCount) {
    TemporaryFolder scratch;
    const auto file = scratch / "a.flac";
    RecordingWriter writer(file, {Container::flac, Encoding::int16, 0.5, WriteMode::whole}, two_channels,
                           Hertz{1250.0});
    writer.write(std::vector<float>{0.74f, -0.74f, 0.76f, -0.76f});
    writer.finish();
    EXPECT_EQ(load_recording(file).data, (std::vector<float>{0.5f, -0.5f, 1.0f, -1.0f}));
}

TEST(RecordingWriter, RefusesAnExistingRecordingUnlessToldToOverwrite) {
    TemporaryFolder scratch;
    const auto file = write(scratch / "a.wav", Encoding::float32, some_floats(10));
    EXPECT_TRUE(test::says(test::line_of<Refusal>([&] { write(file, Encoding::float32, some_floats(20)); }),
                           "a.wav: found a recording that exists"));
    RecordingWriter writer(file, {}, two_channels, Hertz{1250.0}, true);
    writer.write(some_floats(20));
    EXPECT_EQ(load_recording(file).info.frames, 10u) << "the old one stays until the new one is whole";
    writer.finish();
    EXPECT_EQ(load_recording(file).info.frames, 20u);
}

TEST(RecordingWriter, RefusesWhatTheFormatCannotHold) {
    TemporaryFolder scratch;
    const auto refusal = [&](const char* name, RecordingFormat format, std::size_t channels, double rate) {
        return test::line_of<Refusal>(
            [&] { RecordingWriter(scratch / name, format, ripple_channels(channels), Hertz{rate}); });
    };
    EXPECT_TRUE(test::says(refusal("a.flac", {Container::flac, Encoding::float32, 1.0, WriteMode::whole}, 2, 1250.0),
                           "int16 or int24"));
    EXPECT_TRUE(test::says(refusal("a.flac", {Container::flac, Encoding::int16, 1.0, WriteMode::whole}, 9, 1250.0),
                           "at most 8 channels"));
    EXPECT_TRUE(test::says(refusal("a.flac", {Container::flac, Encoding::int16, 1.0, WriteMode::crash_safe}, 2, 1250.0),
                           "survive a crash"));
    EXPECT_TRUE(
        test::says(refusal("a.wav", {Container::wav, Encoding::int16, 0.0, WriteMode::whole}, 2, 1250.0), "above 0"));
    EXPECT_TRUE(test::says(refusal("a.wav", {}, 2, 1250.5), "1250.5 frames a second"));
    EXPECT_TRUE(test::says(refusal("none/a.wav", {}, 2, 1250.0), "no way to write it"));
    EXPECT_TRUE(test::says(test::line_of<Refusal>([] { static_cast<void>(container_for("a.mp3")); }), "'.mp3'"));
}

TEST(RecordingWriter, RawKeepsAFractionalRate) {
    TemporaryFolder scratch;
    EXPECT_EQ(load_recording(write(scratch / "a.raw", Encoding::int16, {1.0f, 2.0f}, 1250.5)).info.rate.value, 1250.5);
}

// The same writer stores a session's samples: killed at any moment, what was written before must be readable.
TEST(RecordingWriter, CrashSafeFilesAreReadableAfterKill9) {
    for (const char* name : {"a.rf64", "a.w64", "a.wav", "a.raw"}) {
        TemporaryFolder scratch;
        const auto file = scratch / name;
        const pid_t child = fork();
        if (child == 0) {
            RecordingWriter writer(file, {container_for(file), Encoding::float32, 0.0, WriteMode::crash_safe},
                                   two_channels, Hertz{1250.0});
            for (int i = 0; i < 50; ++i) {
                writer.write(some_floats(100));
            }
            std::raise(SIGKILL);
        }
        int status = 0;
        waitpid(child, &status, 0);
        ASSERT_TRUE(WIFSIGNALED(status));
        const auto back = load_recording(file);
        EXPECT_EQ(back.info.frames, 5000u) << name;
        EXPECT_EQ(back.info.channels, two_channels) << "the sidecar is there from the start";
        EXPECT_EQ(std::memcmp(back.data.data() + 9800, some_floats(100).data(), 200 * sizeof(float)), 0);
    }
}

TEST(RecordingWriter, CrashSafeFileWithoutASampleIsReadable) {
    TemporaryFolder scratch;
    const auto file = scratch / "a.rf64";
    RecordingWriter writer(file, {Container::rf64, Encoding::float32, 0.0, WriteMode::crash_safe}, two_channels,
                           Hertz{1250.0});
    EXPECT_EQ(load_recording(file).info.frames, 0u);
}

// Peers that nobody here made: sox and ffmpeg decode our files to raw samples, which must be the counts and floats put
// in.
template <class Sample> std::vector<Sample> samples_in(const std::string& bytes) {
    std::vector<Sample> samples(bytes.size() / sizeof(Sample));
    std::memcpy(samples.data(), bytes.data(), samples.size() * sizeof(Sample));
    return samples;
}

TEST(Peers, SoxReadsOurCounts) {
    TemporaryFolder scratch;
    const auto data = counts_as_microvolts(16, 2000);
    for (const char* name : {"a.wav", "a.flac", "a.w64"}) {
        const auto file = write(scratch / name, Encoding::int16, data);
        const auto ran = run("sox -D '" + file.string() + "' -t raw -e signed -b 16 -L - 2>/dev/null");
        ASSERT_EQ(ran.status, 0) << name;
        const auto counts = samples_in<std::int16_t>(ran.out);
        ASSERT_EQ(counts.size(), data.size()) << name;
        for (std::size_t i = 0; i < counts.size(); ++i) {
            ASSERT_EQ(static_cast<float>(counts[i]) * static_cast<float>(microvolts_per_count), data[i]) << name;
        }
    }
}

TEST(Peers, FfmpegReadsOurFloats) {
    TemporaryFolder scratch;
    const auto data = some_floats(2000);
    for (const char* name : {"a.wav", "a.rf64", "a.w64"}) {
        const auto file = write(scratch / name, Encoding::float32, data);
        const auto ran = run("ffmpeg -v error -i '" + file.string() + "' -c:a pcm_f32le -f f32le - 2>/dev/null");
        ASSERT_EQ(ran.status, 0) << name;
        EXPECT_EQ(samples_in<float>(ran.out), data) << name;
    }
}

TEST(Peers, FfprobeSeesRateAndChannels) {
    TemporaryFolder scratch;
    const auto file = write(scratch / "a.rf64", Encoding::int24, counts_as_microvolts(24, 1250));
    const auto ran =
        run("ffprobe -v error -show_entries stream=codec_name,sample_rate,channels,duration -of csv=p=0 '" +
            file.string() + "'");
    EXPECT_EQ(ran.out, "pcm_s24le,1250,2,1.000000\n");
}

TEST(Peers, WeReadWhatFfmpegAndSoxWrite) {
    TemporaryFolder scratch;
    const auto data = counts_as_microvolts(16, 2000);
    const auto ours = write(scratch / "ours.wav", Encoding::int16, data);
    const auto sidecar = sidecar_path(ours).string();
    const std::vector<std::pair<const char*, std::string>> conversions{
        {"f.rf64", "ffmpeg -v error -i OURS -c:a pcm_s16le -rf64 always -f wav OUT"},
        {"f.flac", "ffmpeg -v error -i OURS OUT"},
        {"p.wav", "ffmpeg -v error -i OURS -f wav - | cat > OUT"}, // into a pipe: no length in the header
        {"s.w64", "sox -D OURS OUT"},
        {"s24.wav", "sox -D OURS -b 24 OUT"}};
    for (const auto& [name, pattern] : conversions) {
        std::string command = pattern;
        command.replace(command.find("OURS"), 4, "'" + ours.string() + "'");
        command.replace(command.find("OUT"), 3, "'" + (scratch / name).string() + "'");
        ASSERT_EQ(run(command + " 2>/dev/null").status, 0) << command;
        auto back = load_recording(scratch / name, sidecar);
        ASSERT_EQ(back.data.size(), data.size()) << name;
        const float widened = std::string(name) == "s24.wav" ? 256.0f : 1.0f; // sox fills the lower 8 bits with zeros
        for (std::size_t i = 0; i < data.size(); ++i) {
            ASSERT_EQ(back.data[i], widened * data[i]) << name;
        }
    }
}

TEST(Peers, WeReadTheDoublesThatFfmpegWrites) {
    TemporaryFolder scratch;
    const auto data = some_floats(2000);
    const auto ours = write(scratch / "ours.wav", Encoding::float32, data);
    ASSERT_EQ(
        run("ffmpeg -v error -i '" + ours.string() + "' -c:a pcm_f64le '" + (scratch / "d.wav").string() + "'").status,
        0);
    EXPECT_EQ(load_recording(scratch / "d.wav").data, data);
}

} // namespace
} // namespace millpond
