// The command as a user types it.
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "recording/recording_reader.hpp"
#include "recording/sidecar.hpp"
#include "recording/whole_file.hpp"
#include "support/files.hpp"
#include "support/process.hpp"
#include "support/text.hpp"
#include "synth/named_scenes.hpp"
#include "synth/scene.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::Ran;
using test::run;
using test::TemporaryFolder;

Ran synth(const std::string& arguments) {
    return run(std::string(MILLPOND_PROGRAM) + " synth " + arguments + " 2>&1");
}

TEST(SynthCommand, MakesRecordingSidecarAndTruth) {
    const TemporaryFolder scratch;
    const auto file = scratch / "a.wav";
    const auto ran = synth(file.string() + " --duration-s 30 --sites 2 --reference --seed 3");
    ASSERT_EQ(ran.status, 0) << ran.out;
    EXPECT_TRUE(test::says(ran.out, "frames\t37500\n"));

    SceneSettings settings;
    settings.duration_s = 30.0;
    settings.sites = 2;
    settings.reference = true;
    settings.seed = 3;
    auto scene = Scene::make(settings);
    std::vector<float> made(scene.frames() * 3);
    scene.next(made);

    const auto loaded = load_recording(file);
    EXPECT_EQ(loaded.info.channels, scene.channels());
    ASSERT_EQ(loaded.data.size(), made.size());
    for (std::size_t i = 0; i < made.size(); ++i) {
        ASSERT_NEAR(loaded.data[i], made[i], 0.1001) << "half a count of 0.2 uV";
    }
    const auto truth = read_events_table(truth_path(file), 1250.0);
    ASSERT_EQ(truth.size(), scene.truth().size());
    ASSERT_FALSE(truth.empty());
    for (std::size_t i = 0; i < truth.size(); ++i) {
        EXPECT_EQ(truth[i].trial_type, "ripple");
        EXPECT_EQ(truth[i].sample, static_cast<std::int64_t>(scene.truth()[i].onset.value));
        EXPECT_EQ(truth[i].extra.at("peak_sample"), std::to_string(scene.truth()[i].peak.value));
        EXPECT_EQ(truth[i].extra.at("end_sample"), std::to_string(scene.truth()[i].end.value));
        EXPECT_NEAR((truth[i].onset_s + truth[i].duration_s) * 1250.0, static_cast<double>(scene.truth()[i].end.value),
                    1e-6);
    }
}

TEST(SynthCommand, FloatsAreTheScenesOwnBits) {
    const TemporaryFolder scratch;
    ASSERT_EQ(synth((scratch / "a.rf64").string() + " --duration-s 5 --encoding float32").status, 0);
    SceneSettings settings;
    settings.duration_s = 5.0;
    auto scene = Scene::make(settings);
    std::vector<float> made(scene.frames() * 4);
    scene.next(made);
    EXPECT_EQ(load_recording(scratch / "a.rf64").data, made);
}

TEST(SynthCommand, OptionsOverrideTheSceneFile) {
    const TemporaryFolder scratch;
    const auto scene = scratch.file("scene.yaml", "rate_hz: 2000\nduration_s: 4\nsites: 3\nreference: true\n"
                                                  "ripples:\n  rate_per_s: 1.5\nquiet_start_s: 1\n");
    const auto file = scratch / "a.flac";
    ASSERT_EQ(synth(file.string() + " --scene " + scene.string() + " --sites 1 --no-reference").status, 0);
    const auto loaded = load_recording(file);
    EXPECT_EQ(loaded.info.rate.value, 2000.0);
    EXPECT_EQ(loaded.info.frames, 8000u);
    EXPECT_EQ(loaded.info.channels, (Channels{{"site1", ChannelRole::ripple}}));
}

TEST(SynthCommand, OptionsOverrideANamedScene) {
    const TemporaryFolder scratch;
    const auto file = scratch / "a.rf64";
    ASSERT_EQ(
        synth(file.string() + " --scene hard --duration-s 90 --seed 5 --ripples-rate-per-s 0.7 --encoding float32")
            .status,
        0);
    auto settings = named_scene(SceneName::hard);
    settings.duration_s = 90.0;
    settings.seed = 5;
    settings.ripples.rate_per_s = 0.7;
    auto scene = Scene::make(settings);
    std::vector<float> made(scene.frames() * 5);
    scene.next(made);
    EXPECT_EQ(load_recording(file).data, made);

    std::map<std::string, std::size_t> rows, expected;
    for (const auto& row : read_events_table(truth_path(file), 1250.0)) {
        ++rows[row.trial_type];
        EXPECT_LE(row.onset_s + row.duration_s, 90.0);
    }
    expected["ripple"] = scene.truth().size();
    for (const auto& happening : scene.happenings()) {
        expected[std::string(word_for<HappeningKind>(happening_kinds, happening.kind))] +=
            happening.onset_s < 90.0 ? 1 : 0;
    }
    EXPECT_EQ(rows, expected);
    EXPECT_GT(rows["rest"], 0u);
    EXPECT_GT(rows["run"], 0u);
    EXPECT_GT(rows["gamma"], 0u);
}

TEST(SynthCommand, TruthOfARecordingWithoutRipplesIsATruthButALabelOfAnotherKindIsNone) {
    const TemporaryFolder scratch;
    const auto file = scratch / "a.wav";
    ASSERT_EQ(synth(file.string() + " --scene typical --duration-s 60 --ripples-rate-per-s 0").status, 0);
    ASSERT_FALSE(read_events_table(truth_path(file), 1250.0).empty());
    EXPECT_TRUE(ripples_from_table(truth_path(file), Hertz{1250.0}, 75'000).empty());
    const auto other = scratch.file("labels.tsv", "onset\tduration\ttrial_type\n1\t0.1\tspindle\n");
    EXPECT_TRUE(test::says(test::line_of<Refusal>([&] { (void)ripples_from_table(other, Hertz{1250.0}, 75'000); }),
                           "none of trial_type ripple"));
}

TEST(SynthCommand, RefusesBadInputWithStatus2AndOneLine) {
    const TemporaryFolder scratch;
    const auto file = (scratch / "a.wav").string();
    const auto scene = scratch.file("scene.yaml", "ripples:\n  rate_per_sec: 1.5\n");
    for (const auto& [arguments, words] : std::vector<std::pair<std::string, std::string>>{
             {file + " --rate-hz fast", "command line: --rate-hz: found 'fast'; allowed: a number from 500 to 50000"},
             {file + " --ripples-rate-per-s 99", "--ripples-rate-per-s: found '99'; allowed: a number from 0 to 5"},
             {file + " --sites 2.5", "--sites: found '2.5'; allowed: a whole number"},
             {file + " --encoding int8", "--encoding: found 'int8'; allowed: one of int16, int24, int32, float32"},
             {file + " --ripples-start-hz 700", "below 0.45 of rate_hz"},
             {file + " --scene hrad", "found 'hrad', which is no file; allowed: quiet, typical, hard, running"},
             {file + " --faults-dead-kind gone",
              "--faults-dead-kind: found 'gone'; allowed: one of flat, railed, huge"},
             {file + " --scene " + scene.string(), "did you mean 'rate_per_s'?"},
             {(scratch / "a.mp3").string(), "the ending '.mp3'"}}) {
        const auto ran = synth(arguments);
        EXPECT_EQ(ran.status, 2) << arguments;
        EXPECT_TRUE(test::says(ran.out, words));
        EXPECT_EQ(std::count(ran.out.begin(), ran.out.end(), '\n'), 1) << ran.out;
    }
    EXPECT_FALSE(std::filesystem::exists(file));
}

TEST(SynthCommand, OverwritesOnlyWhenTold) {
    const TemporaryFolder scratch;
    const auto file = (scratch / "a.wav").string();
    ASSERT_EQ(synth(file + " --duration-s 2").status, 0);
    const auto before = read_whole_file(file);
    const auto ran = synth(file + " --duration-s 3");
    EXPECT_EQ(ran.status, 2);
    EXPECT_TRUE(test::says(ran.out, "or --overwrite"));
    EXPECT_EQ(read_whole_file(file), before);
    EXPECT_EQ(synth(file + " --duration-s 3 --overwrite").status, 0);
    EXPECT_EQ(load_recording(file).info.frames, 3750u);
    std::filesystem::remove(file);
    EXPECT_EQ(synth(file + " --duration-s 2").status, 2) << "a truth of that name is there still";
}

TEST(SynthCommand, SaysThatSamplesWereClipped) {
    const TemporaryFolder scratch;
    const auto ran = synth((scratch / "a.wav").string() + " --duration-s 5 --microvolts-per-count 0.002");
    EXPECT_EQ(ran.status, 0);
    EXPECT_TRUE(test::says(ran.out, "were clipped"));
}

// replay_files/README.md names the command that made the recording there: run again, it must give the same.
TEST(ReplayFiles, TheCommandInTheReadmeGivesTheSameSamplesAndTruth) {
    const std::filesystem::path folder = std::filesystem::path(MILLPOND_SOURCE_DIR) / "replay_files";
    const auto readme = read_whole_file(folder / "README.md");
    const auto from = readme.find("build/millpond synth replay_files/") + std::string("build/millpond synth ").size();
    const auto command = readme.substr(from, readme.find('\n', from) - from);
    const auto name = command.substr(0, command.find(' ')).substr(std::string("replay_files/").size());

    const TemporaryFolder scratch;
    const auto again = scratch / name;
    const auto ran = synth(again.string() + command.substr(command.find(' ')));
    ASSERT_EQ(ran.status, 0) << ran.out;
    EXPECT_EQ(load_recording(again).data, load_recording(folder / name).data);
    EXPECT_EQ(load_recording(again).info.channels, load_recording(folder / name).info.channels);
    EXPECT_EQ(read_whole_file(truth_path(again)), read_whole_file(truth_path(folder / name)));
    EXPECT_EQ(read_whole_file(sidecar_path(again)), read_whole_file(sidecar_path(folder / name)));
    EXPECT_TRUE(test::says(readme, std::to_string(read_events_table(truth_path(again), 1250.0).size()) + " ripples"));
}

} // namespace
} // namespace millpond
