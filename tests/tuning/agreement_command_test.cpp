// `dryrun --agreement` as a user meets it, and what a rule's artefacts take from a dry run's eligible time.
#include "app/dry_run.hpp"
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
using test::text_of;
using test::write_text;

struct Bench {
    TemporaryFolder folder;
    std::string arguments;

    explicit Bench(const InventedRecording& recording = InventedRecording(40.0)) {
        recording.write(folder / "r.wav");
        recording.write_truth(folder / "truth.tsv");
        write_text(folder / "s.yaml", "{}\n");
        arguments = "dryrun " + (folder / "r.wav").string() + " --settings " + (folder / "s.yaml").string() +
                    " --out " + (folder / "dry").string();
    }
    [[nodiscard]] nlohmann::json score() const { return nlohmann::json::parse(text_of(folder / "dry/score.json")); }
};

TEST(AgreementCommand, ComparesEveryRuleWithEveryOtherAndWithTheLabels) {
    const Bench bench;
    const auto ran = run_millpond(bench.arguments + " --agreement --labels " + (bench.folder / "truth.tsv").string());
    ASSERT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("Labels of truth.tsv"), std::string::npos);
    const auto table = text_of(bench.folder / "dry/agreement.tsv");
    EXPECT_EQ(std::count(table.begin(), table.end(), '\n'), 1 + 5 * 4);
    const auto agreement = bench.score()["agreement"];
    ASSERT_EQ(agreement["lists"].size(), 5U);
    const auto labels = agreement["lists"][0];
    EXPECT_EQ(labels["by_person"], true);
    for (const auto& pair : agreement["pairs"]) {
        if (pair["events_of"] == "truth.tsv") { // ripples of 15 times the noise: every rule finds nearly all
            EXPECT_GE(pair["shared"]["count"].get<int>(), labels["events"].get<int>() - 2) << pair;
        }
    }
}

TEST(AgreementCommand, AddsAFileWhoseValuesAreThoseOfNoRule) {
    const Bench bench;
    write_text(bench.folder / "mine.yaml", "peak_deviations: 7\n");
    ASSERT_EQ(run_millpond(bench.arguments + " --agreement --referee " + (bench.folder / "mine.yaml").string()).status,
              0);
    const auto score = bench.score();
    EXPECT_EQ(score["agreement"]["lists"].size(), 5U);
    EXPECT_EQ(score["truth"]["referee"]["rule"], "millpond, changed");
    EXPECT_EQ(score["truth"]["ripples"], score["agreement"]["lists"][4]["events"]);
}

TEST(AgreementCommand, TruthByAPublishedRuleIsTheListOfThatRule) {
    const Bench bench;
    const auto ran = run_millpond(bench.arguments + " --agreement --referee deceuninck_2024");
    ASSERT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("referee, rule deceuninck_2024"), std::string::npos);
    const auto score = bench.score();
    EXPECT_EQ(score["agreement"]["lists"].size(), 4U);
    EXPECT_EQ(score["agreement"]["lists"][2]["name"], "deceuninck_2024");
    EXPECT_EQ(score["truth"]["ripples"], score["agreement"]["lists"][2]["events"]);
}

TEST(AgreementCommand, LabelsAndARuleTogetherAreRefusedWithoutIt) {
    const Bench bench;
    const auto ran =
        run_millpond(bench.arguments + " --referee stark_2014 --labels " + (bench.folder / "truth.tsv").string());
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("--agreement"), std::string::npos) << ran.err;
}

TEST(DryRunByTheReferee, TakesArtefactsOutOfEligibleTime) {
    InventedRecording recording(45.0);
    for (std::size_t i = 30 * 1250 * 2; i < 31 * 1250 * 2; ++i) {
        recording.data[i] = 5.0F; // flat for a second, which is no gap
    }
    const Bench bench(recording);
    DryRunPlan plan;
    plan.recording = bench.folder / "r.wav";
    plan.settings = bench.folder / "s.yaml";
    const auto run = dry_run(plan);
    EXPECT_EQ(run.findings.artefacts.flat, 2U); // both channels
    write_text(bench.folder / "off.yaml", "artefacts: {exclude: false}\n");
    plan.referee = (bench.folder / "off.yaml").string();
    const auto without_exclusion = dry_run(plan);
    EXPECT_NEAR((without_exclusion.score.eligible_minutes - run.score.eligible_minutes) * 60.0, 1.2, 0.15);
    EXPECT_LT(run.score.eligible_ripples, without_exclusion.score.eligible_ripples + 1);
}

} // namespace
} // namespace millpond
