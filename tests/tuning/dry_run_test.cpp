#include "app/dry_run.hpp"
#include "app/dry_run_tables.hpp"
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "sham/schedule.hpp"
#include "support/files.hpp"
#include "support/invented_recording.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <algorithm>

namespace millpond {
namespace {

using test::InventedRecording;
using test::run_millpond;
using test::TemporaryFolder;
using test::write_text;

// A recording with its truth and settings in a folder of their own.
struct Bench {
    TemporaryFolder folder;
    DryRunPlan plan;

    explicit Bench(const InventedRecording& recording = InventedRecording(45.0), const std::string& settings = "{}\n") {
        recording.write(folder / "r.wav");
        recording.write_truth(folder / "truth.tsv");
        write_text(folder / "s.yaml", settings);
        plan.recording = folder / "r.wav";
        plan.settings = folder / "s.yaml";
        plan.labels = folder / "truth.tsv";
    }
};

std::uint64_t count(const std::vector<TableEvent>& rows, const std::string& type, const std::string& outcome = {}) {
    return static_cast<std::uint64_t>(std::count_if(rows.begin(), rows.end(), [&](const TableEvent& row) {
        const auto found = row.extra.find("outcome");
        return row.trial_type == type && (outcome.empty() || (found != row.extra.end() && found->second == outcome));
    }));
}

TEST(DryRun, FindsTheRipplesOfItsLabels) {
    const Bench bench;
    const auto run = dry_run(bench.plan);
    EXPECT_EQ(run.truth, "truth.tsv");
    EXPECT_EQ(run.score.early_ms, 0.0);
    EXPECT_GE(run.score.eligible_ripples, 25U);
    EXPECT_GT(run.score.hit_rate.share, 0.9);
    EXPECT_GT(run.score.onset_latency_ms.median, 5.0);
    EXPECT_LT(run.score.onset_latency_ms.median, 40.0);
}

TEST(DryRun, TakesTheRefereesWordWithoutLabelsAndAllowsForItsLateOnsets) {
    Bench bench;
    bench.plan.labels.clear();
    const auto run = dry_run(bench.plan);
    EXPECT_EQ(run.truth, "referee");
    EXPECT_EQ(run.score.early_ms, 10.0);
    EXPECT_GE(run.score.eligible_ripples, 25U);
    EXPECT_GT(run.score.hit_rate.share, 0.9);
}

TEST(DryRun, GivesTheSameEventsAtAnyPacketSize) {
    Bench bench;
    const auto whole = dry_run(bench.plan);
    ASSERT_GT(whole.events.size(), 50U);
    for (const std::size_t frames : {1, 7, 64, 1000, 100000}) {
        bench.plan.packet_frames = frames;
        EXPECT_EQ(dry_run(bench.plan).events, whole.events) << frames << " frames a packet";
    }
}

TEST(DryRun, RunsAsIfArmedUnlessToldOtherwise) {
    Bench bench;
    EXPECT_GT(dry_run(bench.plan).orders.size(), 20U);
    bench.plan.armed = false;
    const auto run = dry_run(bench.plan);
    EXPECT_TRUE(run.orders.empty());
    EXPECT_GT(run.withheld[static_cast<std::size_t>(Rule::not_armed)], 20U);
    EXPECT_GT(run.score.hit_rate.share, 0.9); // the detector is scored all the same
}

TEST(DryRun, LeavesTimeWithoutSignalOutOfEligibleTime) {
    InventedRecording recording(45.0);
    const auto before = dry_run(Bench(recording).plan).score;
    recording.lose(20.0, 26.0);
    const auto run = dry_run(Bench(recording).plan);
    EXPECT_GE(run.gaps, 1U);
    EXPECT_EQ(run.gap_frames, 7500U);
    EXPECT_NEAR((before.eligible_minutes - run.score.eligible_minutes) * 60.0, 6.0, 0.5);
    EXPECT_LT(run.score.eligible_ripples, before.eligible_ripples);
}

TEST(DryRun, PlaysAControlScheduleInsteadOfTheDetections) {
    const Bench bench(InventedRecording(45.0),
                      "arbiter: {condition: yoked, schedule_file: plan.tsv, hold: {schedule: false}}\n");
    write_schedule(bench.folder / "plan.tsv", {SampleIndex{25000}, SampleIndex{30000}}, Hertz{1250.0});
    const auto run = dry_run(bench.plan);
    ASSERT_EQ(run.orders.size(), 2U);
    EXPECT_EQ(run.orders[0].sample.value, 25000U);
    EXPECT_EQ(run.orders[1].sample.value, 30000U);
    EXPECT_GT(run.score.hit_rate.share, 0.9);
}

TEST(DryRun, UsesTheRecordingsRateWhereTheSettingsStreamHasAnother) {
    const Bench bench(InventedRecording(45.0),
                      "stream: {source: pipe, encoding: float32, rate_hz: 30000, channels: 2}\n");
    EXPECT_EQ(dry_run(bench.plan).rate.value, 1250.0);
}

TEST(DryRun, RefusesAListOfChannelsThatTheRecordingDoesNotHave) {
    const Bench bench(InventedRecording(20.0), "channels: [{name: a, role: ripple}]\n");
    EXPECT_THROW(static_cast<void>(dry_run(bench.plan)), Refusal);
}

TEST(DryRun, TakesTheRolesOfTheSettings) {
    const Bench bench(InventedRecording(45.0), "channels: [{name: a, role: ripple}, {name: b, role: reference}]\n"
                                               "detector: {method: envelope, veto: {deviations: 2}}\n");
    const auto run = dry_run(bench.plan);
    // The reference carries the same ripples, and its threshold is the lower one: it vetoes.
    EXPECT_GT(run.withheld[static_cast<std::size_t>(Rule::veto)], 10U);
    EXPECT_LT(run.score.hit_rate.share, 0.5); // what the detector refused itself is no detection to score
}

TEST(Labels, OfAnotherRecordingAreRefused) {
    const TemporaryFolder folder;
    write_text(folder / "l.tsv", "onset\tduration\n10\t0.1\n");
    EXPECT_THROW(static_cast<void>(ripples_from_table(folder / "l.tsv", Hertz{1000.0}, 10000)), Refusal);
    EXPECT_EQ(ripples_from_table(folder / "l.tsv", Hertz{1000.0}, 10001).size(), 1U);
}

TEST(Labels, AreTheRowsOfTypeRippleByOnset) {
    const TemporaryFolder folder;
    write_text(folder / "l.tsv", "onset\tduration\ttrial_type\n5\t0.1\tripple\n1\t0\tpulse\n2\t0.06\tripple\n");
    const auto ripples = ripples_from_table(folder / "l.tsv", Hertz{1000.0}, 10000);
    ASSERT_EQ(ripples.size(), 2U);
    EXPECT_EQ(ripples[0], (Ripple{SampleIndex{2000}, SampleIndex{2030}, SampleIndex{2060}, 0.0}));
    EXPECT_EQ(ripples[1].onset.value, 5000U);
}

TEST(Labels, WithRowsButNoRippleAmongThemAreRefusedAndAnEmptyTableIsNot) {
    const TemporaryFolder folder;
    write_text(folder / "l.tsv", "onset\tduration\ttrial_type\n1\t0\tpulse\n");
    EXPECT_THROW(static_cast<void>(ripples_from_table(folder / "l.tsv", Hertz{1000.0}, 10000)), Refusal);
    write_text(folder / "e.tsv", "onset\tduration\ttrial_type\n");
    EXPECT_TRUE(ripples_from_table(folder / "e.tsv", Hertz{1000.0}, 10000).empty());
}

TEST(DryRunCommand, LeavesATableAndAScoreThatAgree) {
    const Bench bench;
    const auto out = bench.folder / "dry";
    const auto ran =
        run_millpond("dryrun " + bench.plan.recording.string() + " --settings " + bench.plan.settings.string() +
                     " --labels " + bench.plan.labels.string() + " --out " + out.string());
    ASSERT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("hit rate"), std::string::npos);
    const auto rows = read_events_table(out / "events.tsv", 1250.0);
    const auto json = nlohmann::json::parse(std::ifstream(out / "score.json"));
    EXPECT_EQ(count(rows, "detection"), json["detections"]);
    EXPECT_EQ(count(rows, "trigger"), json["triggers"]);
    EXPECT_EQ(count(rows, "pulse"), json["pulses"]);
    EXPECT_EQ(count(rows, "ripple"), json["truth"]["ripples"]);
    EXPECT_EQ(count(rows, "detection", "hit"), json["score"]["hits"]);
    EXPECT_EQ(count(rows, "detection", "repeat"), json["score"]["repeats"]);
    EXPECT_EQ(count(rows, "detection", "false"), json["score"]["false"]);
    EXPECT_EQ(count(rows, "ripple", "hit"), json["score"]["hits"]);
    EXPECT_EQ(count(rows, "ripple", "miss"), json["score"]["misses"]);
    EXPECT_EQ(json["rate_hz"], 1250.0);
    EXPECT_GT(json["delay_ms"], json["filter_delay_ms"]);
    EXPECT_TRUE(std::is_sorted(rows.begin(), rows.end(),
                               [](const TableEvent& a, const TableEvent& b) { return a.onset_s < b.onset_s; }));
}

TEST(DryRunCommand, WritesIntoAnExistingFolderOnlyWhenTold) {
    const Bench bench(InventedRecording(20.0));
    const auto out = bench.folder / "dry";
    const auto arguments = "dryrun " + bench.plan.recording.string() + " --settings " + bench.plan.settings.string() +
                           " --out " + out.string();
    ASSERT_EQ(run_millpond(arguments).status, 0);
    write_text(out / "score.json", "mine");
    EXPECT_EQ(run_millpond(arguments).status, 2);
    EXPECT_EQ(std::filesystem::file_size(out / "score.json"), 4U);
    EXPECT_EQ(run_millpond(arguments + " --overwrite").status, 0);
    EXPECT_GT(std::filesystem::file_size(out / "score.json"), 4U);
}

TEST(DryRunCommand, LeavesNothingBehindWhereTheRecordingIsRefused) {
    const Bench bench(InventedRecording(20.0));
    write_text(bench.folder / "bad.wav", "no recording");
    const auto out = bench.folder / "dry";
    EXPECT_EQ(run_millpond("dryrun " + (bench.folder / "bad.wav").string() + " --settings " +
                           bench.plan.settings.string() + " --out " + out.string())
                  .status,
              2);
    EXPECT_FALSE(std::filesystem::exists(out));
}

TEST(DryRunOutside, RefereeFindsLittleButTheArtefactsOfARatInThetaWithoutRipples) {
    const char* recordings = std::getenv("MILLPOND_RECORDINGS");
    if (recordings == nullptr) {
        GTEST_SKIP() << "SKIPPED LOUDLY: MILLPOND_RECORDINGS is not set, the outside recording was not tried";
    }
    const TemporaryFolder folder;
    write_text(folder / "s.yaml", "{}\n");
    DryRunPlan plan;
    plan.recording = std::filesystem::path(recordings) / "rat_hippocampus_60s.wav";
    plan.settings = folder / "s.yaml";
    const auto run = dry_run(plan);
    EXPECT_EQ(run.frames, 75000U);
    // Its notes name a step at 38.604 s and a burst at 46.9-47.2 s; noise alone may cross once a minute.
    std::size_t artefacts = 0;
    for (const auto& ripple : run.findings.ripples) {
        const double onset_s = seconds_at(ripple.onset, run.rate), end_s = seconds_at(ripple.end, run.rate);
        artefacts += (onset_s < 38.604 && end_s > 38.604) || (onset_s < 47.2 && end_s > 46.9) ? 1 : 0;
    }
    EXPECT_EQ(artefacts, 2U);
    EXPECT_LE(run.findings.ripples.size(), 4U);
}

} // namespace
} // namespace millpond
