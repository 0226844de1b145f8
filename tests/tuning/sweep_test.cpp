#include "app/dry_run.hpp"
#include "app/tune_grid.hpp"
#include "base/refusal.hpp"
#include "support/files.hpp"
#include "support/invented_recording.hpp"
#include "tuning/offline_engine.hpp"
#include "tuning/sweep.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::InventedRecording;
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

std::vector<DetectorSettings>
some(const std::string& values = "order: [1, 2]}, threshold: {deviations: [2, 3, 4, 6]}") {
    return candidates_of(TuneGrid::from_text("detector: {method: [envelope], filter: {" + values + "}", "here"), {})
        .settings;
}

bool same(const PartFigures& a, const PartFigures& b) {
    return a.hits == b.hits && a.ripples == b.ripples && a.false_detections == b.false_detections &&
           a.eligible_frames == b.eligible_frames && a.latency_median_ms == b.latency_median_ms;
}

TEST(Parts, AlternateFromTheFirstSampleAndTheLastMayBeShort) {
    const auto parts = parts_of(350, 100);
    EXPECT_EQ(parts.training, (Intervals{from_to(0, 100), from_to(200, 300)}));
    EXPECT_EQ(parts.held_out, (Intervals{from_to(100, 200), from_to(300, 350)}));
}

TEST(Sweep, GivesTheSameAtAnyNumberOfThreads) {
    const InventedRecording recording(60.0, 10.0, 40.0);
    const auto tuning = tuning_recording(recording);
    const auto candidates = some();
    const auto one = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 1));
    const auto three = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 3));
    ASSERT_EQ(one.size(), candidates.size());
    for (std::size_t i = 0; i < one.size(); ++i) {
        EXPECT_TRUE(same(one[i]->training, three[i]->training)) << i;
        EXPECT_TRUE(same(one[i]->held_out, three[i]->held_out)) << i;
    }
}

TEST(Sweep, ScoresWhatTheEngineDetectsWithoutPulses) {
    InventedRecording recording(60.0, 10.0, 60.0);
    recording.lose(30.0, 31.0);
    const auto tuning = tuning_recording(recording);
    const auto candidates = some();
    const auto results = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 2));
    for (std::size_t i = 0; i < candidates.size(); ++i) {
        auto engine = OfflineEngine::make({candidates[i], {}}, tuning.channels, rate);
        engine.start(false); // no triggers, so nothing is blanked
        engine.process({SampleIndex{0}, tuning.channels.size(), tuning.data});
        engine.finish();
        const auto expected = score(tuning.truth, detections_to_score(engine.events()), engine.eligible(), 0.0, rate);
        EXPECT_EQ(results[i]->training.hits + results[i]->held_out.hits, expected.hits);
        EXPECT_EQ(results[i]->training.false_detections + results[i]->held_out.false_detections,
                  expected.false_detections);
        EXPECT_NEAR(results[i]->training.eligible_minutes + results[i]->held_out.eligible_minutes,
                    expected.eligible_minutes, 1e-9);
        EXPECT_DOUBLE_EQ(results[i]->delay_ms, engine.detector().delay_samples() / 1.25);
    }
}

TEST(Sweep, DoesNotRunAgainWhatIsKnownAndTellsOfTheRest) {
    const InventedRecording recording(30.0);
    const auto tuning = tuning_recording(recording);
    const auto candidates = some();
    SweepResults known(candidates.size());
    known[3] = SweepResult{};
    known[3]->training.hits = 12345; // what no run would give
    std::vector<std::size_t> told;
    SweepWatch watch;
    watch.finished = [&](std::size_t place, const SweepResult&) { told.push_back(place); };
    const auto results = sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 2), watch, known);
    EXPECT_EQ(results[3]->training.hits, 12345U);
    std::sort(told.begin(), told.end());
    EXPECT_EQ(told, (std::vector<std::size_t>{0, 1, 2, 4, 5, 6, 7}));
}

TEST(Sweep, LeavesEmptyWhatItDidNotFinishWhenStopped) {
    const InventedRecording recording(30.0);
    const auto tuning = tuning_recording(recording);
    SweepWatch watch;
    watch.stop = [] { return true; };
    const auto results = sweep(std::span(&tuning, 1),
                               some("low_hz: [100, 110, 120, 130, 140, 150, 160, 170], order: "
                                    "[1, 2, 3, 4]}, threshold: {deviations: [3]}"),
                               plan_of(5.0, 1), watch);
    EXPECT_TRUE(std::any_of(results.begin(), results.end(), [](const auto& each) { return !each.has_value(); }));
}

TEST(Sweep, CountsSeveralRecordingsTogether) {
    const InventedRecording recording(60.0);
    const std::vector both{tuning_recording(recording), tuning_recording(recording)};
    const DetectorSettings candidate;
    const auto one = *sweep(std::span(both).first(1), std::span(&candidate, 1), plan_of(5.0, 1)).front();
    const auto two = *sweep(both, std::span(&candidate, 1), plan_of(5.0, 1)).front();
    EXPECT_EQ(two.training.hits, 2 * one.training.hits);
    EXPECT_EQ(two.held_out.false_detections, 2 * one.held_out.false_detections);
    EXPECT_EQ(two.training.latency_median_ms, one.training.latency_median_ms);
    EXPECT_GT(one.training.hits, 5U);
}

TEST(Sweep, HigherThresholdsNeverGiveMoreFalseDetectionsOnNoise) {
    const InventedRecording noise(14.9 * 4, 10.0, 0.0);
    auto tuning = tuning_recording(noise);
    tuning.truth.clear();
    const auto results =
        sweep(std::span(&tuning, 1), some("order: [2]}, threshold: {deviations: [2, 3, 4, 8]}"), plan_of(5.0, 2));
    for (std::size_t i = 1; i < results.size(); ++i) {
        EXPECT_LE(results[i]->training.false_per_minute, results[i - 1]->training.false_per_minute);
    }
    EXPECT_GT(results.front()->training.false_detections, 0U);
}

TEST(Sweep, RefusesSettingsThatTheRateCannotCarryBeforeAnyIsRun) {
    const InventedRecording recording(20.0);
    const auto tuning = tuning_recording(recording);
    std::vector<DetectorSettings> candidates(6);
    candidates[5].method = DetectionMethod::envelope;
    candidates[5].filter.high_hz = 700.0;
    SweepWatch watch;
    watch.finished = [](std::size_t, const SweepResult&) { ADD_FAILURE(); };
    EXPECT_THROW(static_cast<void>(sweep(std::span(&tuning, 1), candidates, plan_of(5.0, 2), watch)), Refusal);
}

TEST(Confirm, TrainingAndHeldOutTogetherAreTheDryRunOfTheSameSettings) {
    const InventedRecording recording(60.0, 10.0, 60.0);
    const TemporaryFolder folder;
    recording.write(folder / "r.wav");
    recording.write_truth(folder / "truth.tsv");
    write_text(folder / "s.yaml",
               "detector: {threshold: {deviations: 4}, blanking_ms: 60}\narbiter: {lockout_ms: 150}\n");
    DryRunPlan dry;
    dry.recording = folder / "r.wav";
    dry.settings = folder / "s.yaml";
    dry.labels = folder / "truth.tsv";
    const auto run = dry_run(dry);
    const auto& expected = run.score;
    EXPECT_GT(run.orders.size(), 10U); // pulses, so that there is blanking
    const auto tuning = tuning_recording(recording);
    const auto settings = load_settings(folder / "s.yaml");
    auto plan = plan_of(5.0, 2);
    plan.arbiter = settings.arbiter;
    const std::vector candidates{DetectorSettings{}, settings.detector};
    const std::vector<std::size_t> which{1};
    const auto results = confirm(std::span(&tuning, 1), candidates, which, plan);
    EXPECT_FALSE(results[0]);
    EXPECT_EQ(results[1]->training.hits + results[1]->held_out.hits, expected.hits);
    EXPECT_EQ(results[1]->training.ripples + results[1]->held_out.ripples, expected.eligible_ripples);
    EXPECT_EQ(results[1]->training.false_detections + results[1]->held_out.false_detections, expected.false_detections);
    EXPECT_NEAR(results[1]->training.eligible_minutes + results[1]->held_out.eligible_minutes,
                expected.eligible_minutes, 1e-9);
    EXPECT_GT(results[1]->held_out.hits, 5U);
}

} // namespace
} // namespace millpond
