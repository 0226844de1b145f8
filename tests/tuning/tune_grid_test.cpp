#include "app/tune_grid.hpp"
#include "base/refusal.hpp"
#include "support/files.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

DetectorSettings one_band() {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    return settings;
}

using test::TemporaryFolder;

std::string refusal_of(const std::string& yaml) {
    const TemporaryFolder folder;
    try {
        static_cast<void>(TuneGrid::from_file(folder.file("g.yaml", yaml)));
    } catch (const Refusal& refusal) {
        return refusal.what();
    }
    return "nothing was refused";
}

void expect_refused(const std::string& yaml, const std::vector<std::string>& words) {
    const auto line = refusal_of(yaml);
    for (const auto& word : words) {
        EXPECT_NE(line.find(word), std::string::npos) << "for " << yaml << " it said: " << line;
    }
}

TEST(TuneGrid, HoldsEveryCombinationTheLastKeyOfTheSettingsInnermost) {
    const auto grid = TuneGrid::from_text("detector: {threshold: {deviations: [4, 5]}, filter: {order: [1, 2, 3]},\n"
                                          "  envelope: {method: [rectify, energy]}, vote: {rule: count}}",
                                          "here");
    const auto candidates = candidates_of(grid, one_band());
    ASSERT_EQ(candidates.settings.size(), 12U);
    ASSERT_EQ(candidates.axes.size(), 4U);
    EXPECT_EQ(candidates.axes[0].key, "filter.order");
    EXPECT_EQ(candidates.axes[2].key, "threshold.deviations");
    EXPECT_EQ(candidates.values[1], (std::vector<std::string>{"1", "rectify", "5", "count"}));
    EXPECT_EQ(candidates.settings[1].threshold.deviations, 5.0);
    EXPECT_EQ(candidates.settings[2].envelope.method, EnvelopeMethod::energy);
    EXPECT_EQ(candidates.settings[11].filter.order, 3);
    EXPECT_EQ(candidates.settings[11].vote.rule, VoteRule::count);
}

TEST(TuneGrid, LeavesOtherKeysAsTheSettingsHaveThem) {
    auto base = one_band();
    base.filter.low_hz = 111.0;
    base.blanking_ms = 7.0;
    const auto candidates = candidates_of(TuneGrid::from_text("detector: {filter: {order: [2]}}", "here"), base);
    EXPECT_EQ(candidates.settings.front().filter.low_hz, 111.0);
    EXPECT_EQ(candidates.settings.front().blanking_ms, 7.0);
    EXPECT_EQ(candidates.settings.front().filter.order, 2);
}

TEST(TuneGrid, KeepsTheReArmLevelBelowTheThresholdUnlessItIsSweptItself) {
    const auto kept =
        candidates_of(TuneGrid::from_text("detector: {threshold: {deviations: [1.5, 4]}}", "here"), one_band());
    EXPECT_EQ(kept.settings[0].threshold.rearm_deviations, 1.5);
    EXPECT_EQ(kept.settings[1].threshold.rearm_deviations, ThresholdSettings{}.rearm_deviations);
    const auto swept = candidates_of(
        TuneGrid::from_text("detector: {threshold: {deviations: [1.5, 4], rearm_deviations: [1, 3]}}", "here"),
        one_band());
    EXPECT_EQ(swept.settings.size(), 3U); // re-arming at 3 above a threshold of 1.5 is none
    EXPECT_EQ(swept.left_out, 1U);
}

TEST(TuneGrid, LeavesOutBandsWithTheirEdgesTheWrongWayRound) {
    const auto candidates = candidates_of(
        TuneGrid::from_text("detector: {filter: {low_hz: [130, 260], high_hz: [250, 300]}}", "here"), one_band());
    EXPECT_EQ(candidates.settings.size(), 3U);
    EXPECT_EQ(candidates.left_out, 1U);
}

TEST(TuneGrid, RefusesAnUnknownKeyWithTheNearest) {
    expect_refused("detector:\n  filter:\n    low_hs: [1, 2]\n",
                   {"g.yaml:3: detector.filter.low_hs", "an unknown key", "did you mean 'low_hz'?"});
    expect_refused("detector: {treshold: {deviations: [4]}}", {"did you mean 'threshold'?"});
    expect_refused("arbiter: {lockout_ms: [100, 200]}", {"arbiter", "an unknown key", "detector"});
}

TEST(TuneGrid, RefusesEveryBadValueAtItsLine) {
    expect_refused("detector:\n  threshold:\n    deviations: [4,\n      5,\n      -6]\n",
                   {"g.yaml:5: detector.threshold.deviations", "'-6'", "from 0.1 to 100"});
    expect_refused("detector: {filter: {order: [1, 2.5]}}", {"detector.filter.order", "'2.5'", "whole number"});
    expect_refused("detector: {envelope: {method: [energy, rms]}}", {"'rms'", "rectify, energy, analytic"});
    expect_refused("detector: {filter: {order: [1, [2]]}}", {"detector.filter.order", "a list"});
    expect_refused("detector: {filter: {order: [2, 2]}}", {"detector.filter.order", "'2' twice"});
    expect_refused("detector: {filter: {order: []}}", {"detector.filter.order", "an empty list"});
    expect_refused("detector: {filter: {order: }}", {"detector.filter.order", "nothing"});
    expect_refused("detector: {filter: {order: [1], order: [2]}}", {"detector.filter.order", "twice"});
    expect_refused("detector: 5", {"detector", "a group of keys"});
    expect_refused("{}", {"no key with values to try"});
    expect_refused("detector: [", {"g.yaml"});
}

TEST(TuneGrid, RefusesKeysThatNoRecordingWithoutPulsesCanJudge) {
    expect_refused("detector: {blanking_ms: [10, 20]}", {"detector.blanking_ms", "no sweep can judge"});
    expect_refused("detector: {floor: {warm_start_session: [a]}}", {"warm_start_session", "no sweep can judge"});
}

TEST(TuneGrid, TakesTheMethodAndWhatEvidenceIsAskedForButNoLists) {
    const auto candidates = candidates_of(
        TuneGrid::from_text("detector: {method: [evidence], evidence: {false_per_minute: [0.5, 2]}}", "here"),
        one_band());
    ASSERT_EQ(candidates.settings.size(), 2U);
    EXPECT_EQ(candidates.settings[1].method, DetectionMethod::evidence);
    EXPECT_EQ(candidates.settings[1].evidence.false_per_minute, 2.0);
    expect_refused("detector: {evidence: {background: [[1, 2], [3, 4]]}}",
                   {"evidence.background", "lists are learned"});
}

TEST(TuneGrid, TakesInAnotherOneButNoKeyTwice) {
    auto grid = TuneGrid::from_text("detector: {filter: {order: [1, 2]}}", "here");
    grid.add(TuneGrid::from_text("detector: {filter: {low_hz: [120, 130]}, threshold: {deviations: [4]}}", "there"));
    const auto candidates = candidates_of(grid, one_band());
    ASSERT_EQ(candidates.settings.size(), 4U);
    EXPECT_EQ(candidates.axes.front().key, "filter.low_hz");
    EXPECT_EQ(candidates.settings[3].filter.low_hz, 130.0);
    EXPECT_EQ(candidates.settings[3].filter.order, 2);
    EXPECT_THROW(grid.add(TuneGrid::from_text("detector: {filter: {order: [3]}}", "there")), Refusal);
}

TEST(TuneGrid, RefusesKeysThatTheMethodDoesNotLookAt) {
    DetectorSettings evidence;
    EXPECT_THROW(
        static_cast<void>(candidates_of(TuneGrid::from_text("detector: {filter: {order: [1, 2]}}", "here"), evidence)),
        Refusal);
    EXPECT_THROW(static_cast<void>(candidates_of(
                     TuneGrid::from_text("detector: {evidence: {false_per_minute: [1, 2]}}", "here"), one_band())),
                 Refusal);
}

} // namespace
} // namespace millpond
