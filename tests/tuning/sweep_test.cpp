#include "app/dry_run.hpp"
#include "app/tune_grid.hpp"
#include "base/refusal.hpp"
#include "support/files.hpp"
#include "support/invented_recording.hpp"
#include "support/process.hpp"
#include "tuning/sweep.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::InventedRecording;
using test::run_millpond;
using test::TemporaryFolder;
using test::write_text;

constexpr Hertz rate{1250.0};

Interval from_to(std::uint64_t from, std::uint64_t to) {
    return {SampleIndex{from}, SampleIndex{to}};
}

TuningRecording tuning_recording(const InventedRecording& recording) {
    TuningRecording tuning{ripple_channels(recording.channels), recording.data, {}};
    for (const double onset : recording.onsets_s) {
        const auto frame = static_cast<std::uint64_t>(std::llround(onset * rate.value));
        tuning.truth.push_back({SampleIndex{frame}, SampleIndex{frame + 50}, SampleIndex{frame + 100}, 0.0});
    }
    return tuning;
}

SweepPlan plan_of(double block_s, unsigned threads) {
    SweepPlan plan;
    plan.rate = rate;
    plan.block_s = block_s;
    plan.threads = threads;
    return plan;
}

const auto nobody = [](std::size_t) {};

SweepResult result_of(double hit_rate, double false_training, double false_held_out, double latency = 20.0) {
    SweepResult result;
    result.training.eligible_ripples = 100;
    result.training.hit_rate = proportion(static_cast<std::uint64_t>(hit_rate * 100.0), 100);
    result.training.false_per_minute = false_training;
    result.training.onset_latency_ms.median = latency;
    result.held_out.false_per_minute = false_held_out;
    return result;
}

TEST(Parts, AlternateFromTheFirstSampleAndTheLastMayBeShort) {
    const auto parts = parts_of(350, 100);
    EXPECT_EQ(parts.training, (Intervals{from_to(0, 100), from_to(200, 300)}));
    EXPECT_EQ(parts.held_out, (Intervals{from_to(100, 200), from_to(300, 350)}));
}

TEST(Pick, FindsMostAmongThoseAtTheLimitOnTheTrainingParts) {
    const std::vector results{result_of(0.9, 0.5, 0.5), result_of(0.99, 1.2, 0.0), result_of(0.95, 1.0, 1.0)};
    const auto picked = pick(results, 1.0);
    ASSERT_TRUE(picked);
    EXPECT_EQ(picked->index, 2U);
    EXPECT_EQ(picked->passed_over, 0U);
}

TEST(Pick, PassesOverTheOneThatIsAboveTheLimitOnTheHeldOutParts) {
    const std::vector results{result_of(0.9, 0.5, 0.5), result_of(0.99, 0.8, 1.4)};
    const auto picked = pick(results, 1.0);
    ASSERT_TRUE(picked);
    EXPECT_EQ(picked->index, 0U);
    EXPECT_EQ(picked->passed_over, 1U);
}

TEST(Pick, PrefersTheShorterLatencyAtEqualHitRateThenFewerFalse) {
    EXPECT_EQ(pick(std::vector{result_of(0.9, 0.5, 0.5, 25.0), result_of(0.9, 0.9, 0.5, 15.0)}, 1.0)->index, 1U);
    EXPECT_EQ(pick(std::vector{result_of(0.9, 0.9, 0.5), result_of(0.9, 0.5, 0.5)}, 1.0)->index, 1U);
}

TEST(Pick, IsNoneWhereNothingKeepsTheLimitOrNothingIsKnown) {
    EXPECT_FALSE(pick(std::vector{result_of(0.9, 2.0, 0.0), result_of(0.9, 0.0, 2.0)}, 1.0));
    EXPECT_FALSE(pick(std::vector{result_of(0.9, not_known, 0.0), result_of(0.9, 0.0, not_known)}, 1.0));
}

TEST(Sweep, GivesTheSameAtAnyNumberOfThreads) {
    const InventedRecording recording(60.0, 10.0, 40.0);
    const auto tuning = tuning_recording(recording);
    TuneGrid grid;
    grid.smoothing_ms = {4.0};
    const auto candidates = candidates_of(grid, {});
    const auto one = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 1), nobody);
    const auto three = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 3), nobody);
    ASSERT_EQ(one.size(), candidates.size());
    for (std::size_t i = 0; i < one.size(); ++i) {
        EXPECT_EQ(one[i].training.detections, three[i].training.detections) << i;
        EXPECT_EQ(one[i].held_out.hits, three[i].held_out.hits) << i;
    }
}

TEST(Sweep, TrainingAndHeldOutTogetherAreTheDryRunOfTheSameSettings) {
    const InventedRecording recording(60.0, 10.0, 60.0);
    const TemporaryFolder folder;
    recording.write(folder / "r.wav");
    recording.write_truth(folder / "truth.tsv");
    write_text(folder / "s.yaml", "{}\n");
    DryRunPlan dry;
    dry.recording = folder / "r.wav";
    dry.settings = folder / "s.yaml";
    dry.labels = folder / "truth.tsv";
    const auto expected = dry_run(dry).score;
    const auto tuning = tuning_recording(recording);
    const DetectorSettings candidate;
    const auto result = sweep(std::span(&tuning, 1), std::span(&candidate, 1), plan_of(5.0, 2), nobody).front();
    EXPECT_EQ(result.training.hits + result.held_out.hits, expected.hits);
    EXPECT_EQ(result.training.misses + result.held_out.misses, expected.misses);
    EXPECT_EQ(result.training.false_detections + result.held_out.false_detections, expected.false_detections);
    EXPECT_NEAR(result.training.eligible_minutes + result.held_out.eligible_minutes, expected.eligible_minutes, 1e-9);
    EXPECT_GT(result.held_out.hits, 5U);
}

TEST(Sweep, CountsSeveralRecordingsTogether) {
    const InventedRecording recording(60.0);
    const std::vector both{tuning_recording(recording), tuning_recording(recording)};
    const DetectorSettings candidate;
    const auto one = sweep(std::span(both).first(1), std::span(&candidate, 1), plan_of(5.0, 2), nobody).front();
    const auto two = sweep(both, std::span(&candidate, 1), plan_of(5.0, 2), nobody).front();
    EXPECT_EQ(two.training.hits, 2 * one.training.hits);
    EXPECT_EQ(two.held_out.false_detections, 2 * one.held_out.false_detections);
    EXPECT_EQ(two.training.onset_latency_ms.median, one.training.onset_latency_ms.median);
}

TEST(Sweep, HigherThresholdsNeverGiveMoreFalseDetectionsOnNoise) {
    const InventedRecording noise(14.9 * 4, 10.0, 0.0);
    auto tuning = tuning_recording(noise);
    tuning.truth.clear();
    TuneGrid grid;
    grid.low_hz = {150.0};
    grid.order = {2};
    grid.smoothing_ms = {4.0};
    grid.threshold_deviations = {2.0, 3.0, 4.0, 8.0};
    const auto results = sweep(std::span(&tuning, 1), candidates_of(grid, {}), plan_of(5.0, 2), nobody);
    for (std::size_t i = 1; i < results.size(); ++i) {
        EXPECT_LE(results[i].training.false_per_minute, results[i - 1].training.false_per_minute);
    }
    EXPECT_GT(results.front().training.false_detections, 0U);
}

TEST(Sweep, HandsOnTheRefusalOfSettingsThatTheRateCannotCarry) {
    const InventedRecording recording(20.0);
    const auto tuning = tuning_recording(recording);
    std::vector<DetectorSettings> candidates(6);
    candidates[3].filter.high_hz = 700.0;
    EXPECT_THROW(static_cast<void>(sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 2), nobody)), Refusal);
}

TEST(Grid, HoldsEveryCombinationAndKeepsTheReArmLevelBelowTheThreshold) {
    TuneGrid grid;
    grid.low_hz = {130.0, 260.0};
    grid.threshold_deviations = {1.5, 4.0};
    const auto candidates = candidates_of(grid, {});
    EXPECT_EQ(candidates.size(), 1U * 1U * 3U * 3U * 2U); // 260 to 250 Hz is no band
    EXPECT_EQ(candidates[0].threshold.rearm_deviations, 1.5);
    EXPECT_EQ(candidates[1].threshold.rearm_deviations, ThresholdSettings{}.rearm_deviations);
}

TEST(TuneCommand, WritesSettingsThatADryRunTakesWithTheFiguresThatWerePromised) {
    const TemporaryFolder folder;
    const InventedRecording recording(90.0, 10.0, 60.0);
    recording.write(folder / "r.wav");
    recording.write_truth(folder / "truth.tsv");
    write_text(folder / "base.yaml", "arbiter: {lockout_ms: 200}\n");
    const auto at = [&](const char* name) { return (folder / name).string(); };
    const auto ran = run_millpond("tune --labels " + at("truth.tsv") + " " + at("r.wav") + " --settings " +
                                  at("base.yaml") + " --block-s 10 --order 2 --smoothing-ms 4 --low-hz 150 --out " +
                                  at("tuned.yaml") + " --table " + at("table.tsv"));
    ASSERT_EQ(ran.status, 0) << ran.err;
    const auto settings = load_settings(folder / "tuned.yaml");
    EXPECT_EQ(settings.arbiter.lockout_ms, 200.0);
    EXPECT_EQ(settings.channels.size(), 2U);
    DryRunPlan dry;
    dry.recording = folder / "r.wav";
    dry.settings = folder / "tuned.yaml";
    dry.labels = folder / "truth.tsv";
    EXPECT_LE(dry_run(dry).score.false_per_minute, 1.0);
    EXPECT_NE(ran.out.find("picked (*)"), std::string::npos);
    std::ifstream table(folder / "table.tsv");
    std::size_t lines = 0;
    for (std::string line; std::getline(table, line);) {
        ++lines;
    }
    EXPECT_EQ(lines, 9U); // a header and eight thresholds
}

TEST(TuneCommand, WritesNothingWhereNoSettingsKeepTheLimit) {
    const TemporaryFolder folder;
    const InventedRecording recording(60.0);
    recording.write(folder / "r.wav");
    write_text(folder / "none.tsv", "onset\tduration\n"); // every ripple found is then false
    const auto ran =
        run_millpond("tune " + (folder / "r.wav").string() + " --labels " + (folder / "none.tsv").string() +
                     " --block-s 10 --order 2 --smoothing-ms 4 --low-hz 150 --max-false-per-minute 0.5 --out " +
                     (folder / "t.yaml").string());
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("max-false-per-minute"), std::string::npos) << ran.err;
    EXPECT_FALSE(std::filesystem::exists(folder / "t.yaml"));
}

} // namespace
} // namespace millpond
