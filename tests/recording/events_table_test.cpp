#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "recording/whole_file.hpp"
#include "support/files.hpp"
#include "support/text.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::TemporaryFolder;

class EventsTable : public ::testing::Test {
  protected:
    std::vector<TableEvent> read(const std::string& text) {
        return read_events_table(scratch_.file("events.tsv", text), 1250.0);
    }
    std::string refusal(const std::string& text) {
        return test::line_of<Refusal>([&] { static_cast<void>(read(text)); });
    }
    TemporaryFolder scratch_;
};

// The columns are those of BIDS, 'Task events': onset and duration in seconds, trial_type, sample; n/a for missing.
TEST_F(EventsTable, ReadsWhatBidsPrescribes) {
    const auto events = read("onset\tduration\ttrial_type\tsample\tpeak_uv\n"
                             "-0.5\tn/a\tstart\tn/a\tn/a\n"
                             "1.25\t0.0968\tripple\t1562\t163.5\n");
    ASSERT_EQ(events.size(), 2u);
    EXPECT_EQ(events[0].onset_s, -0.5);
    EXPECT_EQ(events[0].duration_s, 0.0);
    EXPECT_EQ(events[0].sample, -625) << "round(onset * rate) where the sample is n/a";
    EXPECT_TRUE(events[0].extra.empty());
    EXPECT_EQ(events[1].trial_type, "ripple");
    EXPECT_EQ(events[1].sample, 1562) << "the column's own value, not the rounded one";
    EXPECT_EQ(events[1].extra.at("peak_uv"), "163.5");
}

TEST_F(EventsTable, TwoColumnsAreEnoughAndMeanRipples) {
    const auto events = read("onset\tduration\r\n2.0004\t0.1\r\n");
    ASSERT_EQ(events.size(), 1u);
    EXPECT_EQ(events[0].trial_type, "ripple");
    EXPECT_EQ(events[0].sample, 2501) << "2.0004 s * 1250 Hz = 2500.5";
}

TEST_F(EventsTable, TakesAByteOrderMarkAndAMissingLastLineEnd) {
    EXPECT_EQ(read("\xEF\xBB\xBFonset\tduration\n1\t2").size(), 1u);
}

TEST_F(EventsTable, KeepsFileOrder) {
    const auto events = read("onset\tduration\n3\t0\n1\t0\n");
    EXPECT_EQ(events[0].onset_s, 3.0);
}

TEST_F(EventsTable, RefusesAMissingColumnAndNamesIt) {
    EXPECT_TRUE(test::says(refusal("onset\ttrial_type\n1\tripple\n"), "events.tsv:1: found no column duration"));
    EXPECT_TRUE(test::says(refusal(""), "events.tsv:1: found no column onset"));
    EXPECT_TRUE(test::says(refusal("onset,duration\n1,2\n"), "no column onset")) << "commas are no tabs";
}

TEST_F(EventsTable, RefusesAColumnTwice) {
    EXPECT_TRUE(test::says(refusal("onset\tduration\tonset\n"), "'onset' twice"));
}

TEST_F(EventsTable, RefusesBadNumbersWithLineAndColumn) {
    EXPECT_TRUE(test::says(refusal("onset\tduration\n1\t0\none\t0\n"), "events.tsv:3: onset: found 'one'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\n1.5x\t0\n"), "events.tsv:2: onset: found '1.5x'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\nnan\t0\n"), "found 'nan'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\ninf\t0\n"), "found 'inf'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\nn/a\t0\n"), "onset: found 'n/a'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\n1\t-0.1\n"), "events.tsv:2: duration: found '-0.1'"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\tsample\n1\t0\t12.5\n"), "events.tsv:2: sample: found '12.5'"));
}

TEST_F(EventsTable, RefusesALineOfAnotherWidth) {
    EXPECT_TRUE(test::says(refusal("onset\tduration\n1\t0\t7\n"), "events.tsv:2: found 3 columns"));
    EXPECT_TRUE(test::says(refusal("onset\tduration\n1\t0\n\n2\t0\n"), "events.tsv:3: found 1 columns"));
}

TEST_F(EventsTable, RefusesAFileThatIsNotThere) {
    EXPECT_TRUE(
        test::says(test::line_of<Refusal>([&] { static_cast<void>(read_events_table(scratch_ / "none.tsv", 1250.0)); }),
                   "none.tsv: found no file"));
}

TEST_F(EventsTable, WritesSortedByOnsetAndReadsBackTheSame) {
    TableEvent late{0.1 + 0.2, 0.0968, "ripple", 375, {{"peak_uv", "163.5"}}};
    TableEvent early{-1.0 / 3.0, 0.0, "note with spaces", -416, {}};
    const auto file = scratch_ / "out.tsv";
    write_events_table(file, {late, early}, {"peak_uv", "frequency_hz"});
    EXPECT_TRUE(test::says(read_whole_file(file), "onset\tduration\ttrial_type\tsample\tpeak_uv\tfrequency_hz\n"));
    const auto back = read_events_table(file, 1250.0);
    ASSERT_EQ(back.size(), 2u);
    EXPECT_EQ(back[0].onset_s, early.onset_s) << "every digit";
    EXPECT_EQ(back[0].trial_type, early.trial_type);
    EXPECT_EQ(back[0].sample, early.sample);
    EXPECT_EQ(back[0].extra, early.extra);
    EXPECT_EQ(back[1].onset_s, late.onset_s);
    EXPECT_EQ(back[1].extra, late.extra);
    EXPECT_FALSE(std::filesystem::exists(unfinished_path(file)));
}

TEST_F(EventsTable, RefusesToWriteAValueThatWouldBreakTheTable) {
    const auto file = scratch_ / "out.tsv";
    EXPECT_THROW(write_events_table(file, {{0.0, 0.0, "a\tb", 0, {}}}, {}), Refusal);
    EXPECT_FALSE(std::filesystem::exists(file));
}

} // namespace
} // namespace millpond
