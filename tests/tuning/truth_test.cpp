// A person's table as truth, and the referee's rule by name or file.
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "referee/referee_rules.hpp"
#include "support/files.hpp"
#include "support/text.hpp"

#include <gtest/gtest.h>

namespace millpond::test {
namespace {

class PersonsTable : public ::testing::Test {
  protected:
    Ripples read(const std::string& text, const LabelReading& reading = {}) {
        return ripples_from_table(folder_.file("labels.tsv", text), Hertz{1000.0}, 60000, reading);
    }
    std::string refusal(const std::string& text, const LabelReading& reading = {}) {
        return line_of<Refusal>([&] { static_cast<void>(read(text, reading)); });
    }
    TemporaryFolder folder_;
};

TEST_F(PersonsTable, MayHaveOtherColumnsOtherRowsAndAnyOrder) {
    const auto ripples = read("onset\tduration\trater\ttrial_type\tcomment\tconfidence\n"
                              "12.5\t0.08\tAB\tSWR\tlarge, with a sharp wave\t3\n"
                              "3\tn/a\tAB\tarousal\t\tn/a\n"
                              "2.25\t0.05\tAB\tSWR\tn/a\t1\n"
                              "-1\t0.5\tAB\tSWR\tbefore the start\t1\n",
                              {"SWR", 0.0});
    ASSERT_EQ(ripples.size(), 2U);
    EXPECT_EQ(ripples[0], (Ripple{SampleIndex{2250}, SampleIndex{2275}, SampleIndex{2300}, 0.0}));
    EXPECT_EQ(ripples[1].onset.value, 12500U);
}

TEST_F(PersonsTable, WithoutTheTypeAskedForIsRefusedWithTheTypesItHas) {
    const auto said = refusal("onset\tduration\ttrial_type\n1\t0.1\tSWR\n2\t0.1\tSWR\n3\t0\tnoise\n");
    EXPECT_TRUE(says(said, "labels.tsv: found 3 rows, none of trial_type ripple, but 2 'SWR', 1 'noise'")) << said;
    EXPECT_TRUE(says(said, "--label-type"));
}

TEST_F(PersonsTable, WithoutDurationsIsRefusedUnlessALengthIsGiven) {
    const std::string table = "onset\tduration\n1\t0.1\n2\tn/a\n3\t0\n";
    const auto said = refusal(table);
    EXPECT_TRUE(says(said, "found a ripple at 2.000 s without a duration")) << said;
    EXPECT_TRUE(says(said, "--point-label-ms"));
    const auto ripples = read(table, {"ripple", 80.0});
    ASSERT_EQ(ripples.size(), 3U);
    EXPECT_EQ(ripples[0].end.value, 1100U); // its own
    EXPECT_EQ(ripples[1], (Ripple{SampleIndex{1960}, SampleIndex{2000}, SampleIndex{2040}, 0.0}));
    EXPECT_EQ(ripples[2].onset.value, 2960U);
}

TEST_F(PersonsTable, WithRowsThatOverlapIsRefusedAndWithRowsThatTouchIsNot) {
    const auto said = refusal("onset\tduration\n5\t0.1\n1\t0.1\n1.05\t0.1\n");
    EXPECT_TRUE(says(said, "found ripples at 1.000 s and 1.050 s that overlap")) << said;
    EXPECT_TRUE(says(refusal("onset\tduration\n1\t0.1\n1\t0.1\n"), "overlap")) << "the same row twice";
    EXPECT_EQ(read("onset\tduration\n1\t0.1\n1.1\t0.1\n").size(), 2U);
}

class RuleOrFile : public ::testing::Test {
  protected:
    std::string refusal(const std::string& yaml) {
        const auto file = folder_.file("rule.yaml", yaml).string();
        return line_of<Refusal>([&] { static_cast<void>(referee_settings_of(file)); });
    }
    TemporaryFolder folder_;
};

TEST_F(RuleOrFile, TakesEveryRuleByName) {
    EXPECT_EQ(referee_settings_of(""), RefereeSettings{});
    for (const auto& rule : referee_rules) {
        EXPECT_EQ(referee_settings_of(std::string(rule.word)), settings_of(rule.value));
    }
}

TEST_F(RuleOrFile, FileThatNamesARuleHasItsValuesAndMayChangeArtefactsAlone) {
    const auto file = folder_.file("rule.yaml", "artefacts: {pad_ms: 20}\nrule: deceuninck_2024\norder: 3\n");
    const auto settings = referee_settings_of(file.string());
    EXPECT_EQ(settings.low_hz, 140.0);
    EXPECT_EQ(settings.min_duration_ms, 40.0);
    EXPECT_EQ(settings.artefacts.pad_ms, 20.0);
    EXPECT_FALSE(departure_from_rule(settings));
}

TEST_F(RuleOrFile, FileThatNamesARuleAndChangesAKeyOfItIsRefusedAtItsLine) {
    const auto said = refusal("rule: stark_2014\n\npeak_deviations: 4\n");
    EXPECT_TRUE(says(said, "rule.yaml:3: peak_deviations: found 4.0; allowed: 5.0, which rule stark_2014 fixes"))
        << said;
}

TEST_F(RuleOrFile, FileOfNoKnownRuleIsRefusedWithThoseThatAreKnown) {
    EXPECT_TRUE(says(refusal("rule: nobody_1999\n"), "one of millpond, gillespie_2024, deceuninck_2024, stark_2014"));
    EXPECT_TRUE(says(refusal("artefacts: {padding_ms: 1}\n"), "did you mean 'pad_ms'"));
}

} // namespace
} // namespace millpond::test
