// Recordings that must not be taken, and the line that says why.
#include "base/refusal.hpp"
#include "recording/recording_reader.hpp"
#include "recording/recording_writer.hpp"
#include "recording/whole_file.hpp"
#include "support/files.hpp"
#include "support/process.hpp"
#include "support/text.hpp"

#include <gtest/gtest.h>

#include <cstring>

namespace millpond {
namespace {

class Unfit : public ::testing::Test {
  protected:
    std::filesystem::path written(const std::string& name, Encoding encoding, std::size_t frames = 1000) {
        const auto file = scratch_ / name;
        RecordingWriter writer(file, {container_for(file), encoding, 0.5, WriteMode::whole}, ripple_channels(2),
                               Hertz{1250.0});
        std::vector<float> data(2 * frames);
        for (std::size_t i = 0; i < data.size(); ++i) {
            data[i] = static_cast<float>(i * 7919 % 1000); // FLAC must not shrink it to nothing
        }
        writer.write(data);
        writer.finish();
        return file;
    }
    std::string refusal(const std::filesystem::path& file, const std::filesystem::path& sidecar = {}) {
        return test::line_of<Refusal>([&] { static_cast<void>(load_recording(file, sidecar)); });
    }
    test::TemporaryFolder scratch_;
};

TEST_F(Unfit, IntegersWithoutAScaleAreRefused) {
    for (const char* name : {"a.wav", "a.flac"}) {
        const auto file = written(name, Encoding::int16);
        std::filesystem::remove(sidecar_path(file));
        EXPECT_TRUE(test::says(refusal(file), "integer samples of no known scale; allowed: microvolts_per_count"));
    }
}

TEST_F(Unfit, FloatsWithoutASidecarAreMicrovolts) {
    const auto file = written("a.wav", Encoding::float32);
    std::filesystem::remove(sidecar_path(file));
    const auto loaded = load_recording(file);
    EXPECT_EQ(loaded.data[1], 919.0f); // 7919 % 1000, as written
    EXPECT_EQ(loaded.info.channels, ripple_channels(2));
}

TEST_F(Unfit, FloatsAreScaledWhereTheSidecarSays) {
    const auto file = written("a.wav", Encoding::float32);
    EXPECT_EQ(load_recording(file, scratch_.file("mV.yaml", "microvolts_per_count: 1000\n")).data[1], 919000.0f);
}

TEST_F(Unfit, UnknownSidecarKeysAreRefusedWithTheNearest) {
    const auto file = written("a.wav", Encoding::float32);
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "microvolt_per_count: 2\n")),
                           "s.yaml:1: microvolt_per_count: found an unknown key; allowed: did you mean "
                           "'microvolts_per_count'?"));
    EXPECT_TRUE(
        test::says(refusal(file, scratch_.file("s.yaml", "channels:\n  - {name: a, rule: ripple}\n  - {name: b}\n")),
                   "channels[0].rule"));
}

TEST_F(Unfit, SidecarsThatDoNotFitTheFileAreRefused) {
    const auto file = written("a.wav", Encoding::float32);
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "channels: [{name: a}]\n")),
                           "s.yaml: channels: found 1 channels; allowed: the recording's 2"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "channels: [{name: a}, {name: a}]\n")), "'a' twice"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "channels: [{name: a}, {role: unused}]\n")),
                           "a channel without a name"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "rate_hz: 1000\n")), "rate_hz: found 1000"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "channel_count: 3\n")), "channel_count: found 3"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "encoding: int16\n")), "only raw files need one"));
    EXPECT_TRUE(test::says(refusal(file, scratch_ / "none.yaml"), "none.yaml: found no file"));
}

TEST_F(Unfit, RawWithoutItsShapeIsRefused) {
    const auto file = scratch_.file("a.raw", std::string(1000, 'x'));
    EXPECT_TRUE(test::says(refusal(file), "rate_hz, channel_count and encoding in"));
    EXPECT_TRUE(
        test::says(refusal(file, scratch_.file("s.yaml", "rate_hz: 1250\nencoding: float32\n")), "channel_count"));
    EXPECT_TRUE(test::says(refusal(file, scratch_.file("s.yaml", "rate_hz: 1250\nencoding: int12\nchannel_count: 2\n")),
                           "'int12'; allowed: one of int16, int24, int32, float32"));
    EXPECT_TRUE(
        test::says(refusal(file, scratch_.file("s.yaml", "rate_hz: 1250\nencoding: float32\nchannel_count: 3\n")),
                   "1000 bytes; allowed: whole frames of 12 bytes"));
    EXPECT_EQ(refusal(file, scratch_.file("s.yaml", "rate_hz: 1250\nencoding: float32\nchannel_count: 2\n")), "");
}

TEST_F(Unfit, RawTakesItsChannelCountFromTheList) {
    const auto file = scratch_.file("a.raw", std::string("\x01\x00\x02\x00\xff\xff\x03\x00", 8));
    const auto sidecar = scratch_.file("s.yaml", "rate_hz: 20000\nencoding: int16\nmicrovolts_per_count: 2\n"
                                                 "channels: [{name: a}, {name: b, role: reference}]\n");
    const auto loaded = load_recording(file, sidecar);
    EXPECT_EQ(loaded.data, (std::vector<float>{2.0f, 4.0f, -2.0f, 6.0f})) << "little endian";
    EXPECT_EQ(loaded.info.channels[1].role, ChannelRole::reference);
    EXPECT_EQ(loaded.info.rate.value, 20000.0);
}

TEST_F(Unfit, FilesCutShortAreRefused) {
    for (const char* name : {"a.wav", "a.rf64", "a.w64"}) {
        const auto file = written(name, Encoding::float32);
        std::filesystem::resize_file(file, std::filesystem::file_size(file) / 2);
        EXPECT_TRUE(test::says(refusal(file), "a file cut short")) << name;
    }
    const auto flac = written("a.flac", Encoding::int16, 50'000);
    std::filesystem::resize_file(flac, std::filesystem::file_size(flac) / 2);
    EXPECT_TRUE(test::says(refusal(flac), "a.flac: found"));
}

TEST_F(Unfit, CutFilesAreReadAsTheyAreWhereThatIsAskedFor) {
    for (const char* name : {"a.wav", "a.rf64", "a.w64"}) {
        const auto file = written(name, Encoding::float32);
        std::filesystem::resize_file(file, std::filesystem::file_size(file) - 800);
        const auto reader = open_recording(file, {}, CutFile::read_as_it_is);
        std::vector<float> data(2000);
        EXPECT_EQ(reader->read(data), 900u) << name;
        EXPECT_EQ(data[1799], static_cast<float>(1799 * 7919 % 1000));
    }
}

TEST_F(Unfit, OtherFilesAreRefused) {
    EXPECT_TRUE(test::says(refusal(scratch_ / "none.wav"), "none.wav: found no such file"));
    EXPECT_TRUE(test::says(refusal(scratch_ / ""), "no regular file"));
    EXPECT_TRUE(test::says(refusal(scratch_.file("a.wav", "")), "a.wav: found no recording"));
    EXPECT_TRUE(test::says(refusal(scratch_.file("a.wav", "hello, I am a text")), "a.wav: found no recording"));
    EXPECT_TRUE(test::says(refusal(scratch_.file("a.wav", "RIFF")), "a.wav: found"));
}

TEST_F(Unfit, OtherKindsOfSoundAreRefused) {
    ASSERT_EQ(test::run("sox -n -r 8000 '" + (scratch_ / "a.aiff").string() + "' synth 0.1 sine 100").status, 0);
    EXPECT_TRUE(test::says(refusal(scratch_ / "a.aiff"), "another kind of sound file"));
    ASSERT_EQ(test::run("sox -n -r 8000 -e a-law '" + (scratch_ / "a.wav").string() + "' synth 0.1 sine 100").status,
              0);
    EXPECT_TRUE(test::says(refusal(scratch_ / "a.wav"), "samples of another kind"));
}

TEST(OutsideRecording, RatWavHasTheStatedShape) {
    const auto folder = test::outside_recordings();
    if (folder.empty()) {
        GTEST_SKIP() << "MILLPOND_RECORDINGS is not set: the outside recordings were NOT read";
    }
    // Stated beside the recording: 60 s at 1250 Hz, two channels, microvolts as 32-bit float.
    const auto loaded = load_recording(folder / "rat_hippocampus_60s.wav");
    EXPECT_EQ(loaded.info.format, "WAV");
    EXPECT_EQ(loaded.info.rate.value, 1250.0);
    EXPECT_EQ(loaded.info.frames, 75'000u);
    ASSERT_EQ(loaded.info.channels.size(), 2u);
    const auto decoded =
        test::run("ffmpeg -v error -i '" + (folder / "rat_hippocampus_60s.wav").string() + "' -f f32le - 2>/dev/null");
    ASSERT_EQ(decoded.out.size(), loaded.data.size() * sizeof(float));
    EXPECT_EQ(std::memcmp(decoded.out.data(), loaded.data.data(), decoded.out.size()), 0) << "as ffmpeg reads it";
}

} // namespace
} // namespace millpond
