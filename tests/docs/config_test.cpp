// The settings files that people start from are valid, and those that belong together agree.
#include "app/wiring.hpp"
#include "docs/documents.hpp"
#include "referee/referee_settings.hpp"
#include "settings/settings.hpp"
#include "settings/yaml_reader.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <map>

namespace millpond::test {
namespace {

const std::filesystem::path config = source_folder / "config";

std::vector<std::filesystem::path> settings_files() {
    std::vector<std::filesystem::path> files;
    for (const auto& entry : std::filesystem::recursive_directory_iterator(config)) {
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
    for (const auto* name : {"live.yaml", "dryrun.yaml", "tune.yaml", "referee.yaml"}) {
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

Settings of_condition(const std::string& name) {
    return load_settings(config / "conditions" / (name + ".yaml"));
}

/// What is left of a condition's settings without that which makes it comparable with the others.
Settings without_controls(Settings settings) {
    settings.arbiter.condition = {};
    settings.arbiter.schedule_file.clear();
    settings.arbiter.delay = {};
    settings.schedule = {};
    return settings;
}

const std::map<std::string, Condition> condition_files{
    {"disrupt", Condition::disrupt},           {"delayed", Condition::delayed}, {"yoked", Condition::yoked},
    {"rate_matched", Condition::rate_matched}, {"none", Condition::none},       {"catch_trials", Condition::disrupt}};

// A control session that differs in anything but its condition is no control.
TEST(Config, ConditionsDifferFromLiveWhereTheyMustAlone) {
    const auto live = settings_to_yaml(without_controls(load_settings(config / "live.yaml")));
    for (const auto& [name, condition] : condition_files) {
        SCOPED_TRACE(name);
        auto settings = of_condition(name);
        EXPECT_EQ(settings.arbiter.condition, condition);
        EXPECT_EQ(settings.arbiter.hold.schedule, name != "yoked");
        settings.arbiter.hold.schedule = true;
        EXPECT_EQ(settings.arbiter.catch_share > 0.0, name == "catch_trials");
        settings.arbiter.catch_share = 0.0;
        EXPECT_EQ(settings_to_yaml(without_controls(settings)), live);
    }
}

// The moments at which any condition may give a pulse are blanked in all of them.
TEST(Config, ConditionsAreComparableWithOneAnother) {
    const auto disrupt = of_condition("disrupt");
    EXPECT_TRUE(disrupt.arbiter.delay.in_every_condition);
    EXPECT_FALSE(disrupt.arbiter.schedule_file.empty());
    for (const auto& [name, condition] : condition_files) {
        SCOPED_TRACE(name);
        const auto settings = of_condition(name);
        EXPECT_EQ(settings.arbiter.delay, disrupt.arbiter.delay);
        EXPECT_EQ(settings.arbiter.schedule_file, disrupt.arbiter.schedule_file);
        EXPECT_EQ(settings.schedule, disrupt.schedule);
    }
    EXPECT_EQ(std::distance(std::filesystem::directory_iterator(config / "conditions"), {}),
              static_cast<std::ptrdiff_t>(condition_files.size()));
}

TEST(Config, TuneStartsFromTheStreamOfLive) {
    const auto live = load_settings(config / "live.yaml");
    const auto tune = load_settings(config / "tune.yaml");
    EXPECT_EQ(tune.stream, live.stream);
    EXPECT_EQ(tune.channels, live.channels);
    EXPECT_EQ(tune.outputs, live.outputs);
}

} // namespace
} // namespace millpond::test
