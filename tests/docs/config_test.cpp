// The settings files that people start from are valid, and those that belong together agree.
#include "app/wiring.hpp"
#include "docs/documents.hpp"
#include "referee/referee_settings.hpp"
#include "settings/settings.hpp"
#include "settings/yaml_reader.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond::test {
namespace {

const std::filesystem::path config = source_folder / "config";

std::vector<std::filesystem::path> settings_files() {
    std::vector<std::filesystem::path> files;
    for (const auto& entry : std::filesystem::directory_iterator(config)) {
        if (entry.path().extension() == ".yaml" && entry.path().filename() != "referee.yaml") {
            files.push_back(entry.path());
        }
    }
    return files;
}

bool is_for_a_stream(const std::filesystem::path& file) {
    const auto lines = lines_of(text_of(file));
    return std::any_of(lines.begin(), lines.end(), [](const auto& line) { return line.starts_with("stream:"); });
}

TEST(Config, HasAFileForEachUse) {
    for (const auto* name : {"live.yaml", "dryrun.yaml", "tune.yaml", "sham.yaml", "referee.yaml"}) {
        EXPECT_TRUE(std::filesystem::exists(config / name)) << name;
    }
}

TEST(Config, EveryFileLoadsAndMakesADetector) {
    for (const auto& file : settings_files()) {
        SCOPED_TRACE(file.string());
        const auto settings = load_settings(file);
        const auto channels = settings.channels.empty() ? ripple_channels(4) : settings.channels;
        EXPECT_NO_THROW((void)make_detector(settings, channels, Hertz{1250.0}));
    }
}

TEST(Config, RefereeFileSaysTheDefaults) {
    EXPECT_EQ(read_yaml_file<RefereeSettings>(config / "referee.yaml"), RefereeSettings{});
}

TEST(Config, StreamsSayAllThatASessionNeeds) {
    int streams = 0;
    for (const auto& file : settings_files()) {
        if (is_for_a_stream(file)) {
            SCOPED_TRACE(file.string());
            const auto settings = load_settings(file);
            const auto stream = resolved(settings.stream, file);
            EXPECT_EQ(stream.channels, settings.channels.size());
            ++streams;
        }
    }
    EXPECT_GE(streams, 3);
}

// Arming is the operator's act. Only the demonstration, which has no animal, begins armed.
TEST(Config, NoFileForARigStartsArmed) {
    for (const auto& file : settings_files()) {
        EXPECT_TRUE(file.filename() == "demo.yaml" || !load_settings(file).arbiter.start_armed) << file;
    }
}

// A control session that differs in anything but its condition is no control.
TEST(Config, ShamDiffersFromLiveInItsConditionAlone) {
    const auto live = load_settings(config / "live.yaml");
    auto sham = load_settings(config / "sham.yaml");
    EXPECT_EQ(sham.arbiter.condition, Condition::yoked);
    sham.arbiter.condition = live.arbiter.condition;
    sham.arbiter.schedule_file = live.arbiter.schedule_file;
    sham.session.name = live.session.name;
    EXPECT_EQ(settings_to_yaml(sham), settings_to_yaml(live));
}

TEST(Config, TuneStartsFromTheStreamOfLive) {
    const auto live = load_settings(config / "live.yaml");
    const auto tune = load_settings(config / "tune.yaml");
    EXPECT_EQ(tune.stream, live.stream);
    EXPECT_EQ(tune.channels, live.channels);
    EXPECT_EQ(tune.output, live.output);
}

} // namespace
} // namespace millpond::test
