#include "journal/sample_file.hpp"
#include "journal/session_reader.hpp"
#include "journal/session_support.hpp"
#include "recording/recording_reader.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace millpond {
namespace {

using namespace test;

std::vector<float> ramp(std::uint64_t first, std::size_t frames) {
    std::vector<float> data;
    for (std::size_t i = 0; i < frames; ++i) {
        data.push_back(static_cast<float>(first + i));
        data.push_back(-0.25F * static_cast<float>(first + i));
    }
    return data;
}

class StoredSamples : public ::testing::TestWithParam<StoreSamples> {};

TEST_P(StoredSamples, AreBitForBitWhatTheLoopStoredAndMissingFramesAreNan) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp, GetParam()), about_stream());
    const auto first = ramp(0, 100);
    auto second = ramp(150, 7);
    second[4] = std::numeric_limits<float>::infinity();
    writer->store({SampleIndex{0}, 2, first});
    writer->store({SampleIndex{150}, 2, second});
    writer->close(SampleIndex{157});

    auto samples = SessionReader(writer->folder()).open_samples();
    ASSERT_TRUE(samples.has_value());
    EXPECT_EQ(samples->frames(), 157U);
    EXPECT_EQ(samples->channels(), 2U);
    std::vector<float> data(157 * 2);
    ASSERT_EQ(samples->read(data), 157U);
    EXPECT_TRUE(std::equal(first.begin(), first.end(), data.begin()));
    for (std::size_t i = 200; i < 300; ++i) {
        EXPECT_TRUE(std::isnan(data[i]));
    }
    EXPECT_TRUE(std::equal(second.begin(), second.end(), data.begin() + 300));
}

TEST_P(StoredSamples, AreReadableByFfprobeAndSox) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp, GetParam()), about_stream());
    writer->store({SampleIndex{0}, 2, ramp(0, 1250)});
    writer->close(SampleIndex{1250});
    const auto file = (writer->folder() / sample_file_name(GetParam())).string();

    const auto probed = run("ffprobe -v error -show_entries stream=codec_name,sample_rate,channels,duration_ts "
                            "-of default=noprint_wrappers=1 " +
                            file + " 2>&1")
                            .out;
    EXPECT_NE(probed.find("codec_name=pcm_f32le"), std::string::npos) << probed;
    EXPECT_NE(probed.find("sample_rate=1250"), std::string::npos) << probed;
    EXPECT_NE(probed.find("channels=2"), std::string::npos) << probed;
    EXPECT_NE(probed.find("duration_ts=1250"), std::string::npos) << probed;
    if (GetParam() == StoreSamples::w64) { // sox reads W64 through libsndfile; it knows no RF64 of its own
        EXPECT_EQ(run("soxi -s " + file + " 2>&1").out, "1250\n");
    }
    // The values as ffmpeg decodes them.
    const auto raw = temp.path() / "decoded.raw";
    run("ffmpeg -v error -i " + file + " -f f32le " + raw.string());
    const auto wanted = ramp(0, 1250);
    const auto bytes = text_of(raw);
    ASSERT_EQ(bytes.size(), wanted.size() * sizeof(float));
    EXPECT_EQ(std::memcmp(bytes.data(), wanted.data(), bytes.size()), 0);
}

TEST_P(StoredSamples, AreReadableWithoutEverBeingClosed) {
    const TemporaryFolder temp;
    const auto file = temp.path() / sample_file_name(GetParam());
    SampleFileWriter writer(file, GetParam(), Hertz{1250.0}, 2);
    ASSERT_TRUE(writer.write(ramp(0, 500)));
    ASSERT_TRUE(writer.update_header());
    ASSERT_TRUE(writer.write(ramp(500, 3))); // not yet in the header
    const auto copy = temp.path() / "as_killed";
    std::filesystem::copy_file(file, copy);
    const SampleFileReader reader(copy);
    EXPECT_GE(reader.frames(), 500U);
    EXPECT_LE(reader.frames(), 503U);
}

TEST_P(StoredSamples, OpenAsARecordingWithTheSessionsNamesAndRoles) {
    const TemporaryFolder temp;
    auto about = about_stream();
    about.channels = {{"CA1", ChannelRole::ripple}, {"cortex", ChannelRole::reference}};
    auto writer = SessionWriter::open(session_in(temp, GetParam()), about);
    const auto data = ramp(0, 100);
    writer->store({SampleIndex{10}, 2, data});
    writer->close(SampleIndex{110});
    const auto recording = load_recording(writer->folder() / sample_file_name(GetParam()));
    EXPECT_EQ(recording.info.channels, about.channels);
    ASSERT_EQ(recording.info.frames, 110U);
    EXPECT_TRUE(std::isnan(recording.data[0])) << "the ten frames that never came";
    EXPECT_TRUE(std::equal(data.begin(), data.end(), recording.data.begin() + 20));
}

INSTANTIATE_TEST_SUITE_P(BothFormats, StoredSamples, ::testing::Values(StoreSamples::rf64, StoreSamples::w64),
                         [](const auto& format) { return format.param == StoreSamples::rf64 ? "rf64" : "w64"; });

} // namespace
} // namespace millpond
