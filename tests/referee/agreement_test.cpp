#include "referee/agreement.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <sstream>

namespace millpond {
namespace {

Ripples list(std::initializer_list<std::pair<std::uint64_t, std::uint64_t>> events) {
    Ripples ripples;
    for (const auto& [onset, end] : events) {
        ripples.push_back({SampleIndex{onset}, SampleIndex{(onset + end) / 2}, SampleIndex{end}, 0.0});
    }
    return ripples;
}

// At 1000 Hz a frame is a millisecond.
Agreement compare(Ripples a, Ripples b, const Intervals& excluded = {}, bool a_by_person = false) {
    return agreement_of({{"a", std::move(a), a_by_person}, {"b", std::move(b), false}}, excluded, Hertz{1000.0});
}

TEST(Agreement, CountsEventsThatShareAFrameFromBothSides) {
    const auto both = compare(list({{100, 150}, {200, 250}, {300, 350}}), list({{140, 180}, {250, 260}, {351, 400}}));
    EXPECT_EQ(both.side(0, 1).shared.count, 2U); // 250 is in both; 350 and 351 are neighbours
    EXPECT_EQ(both.side(0, 1).shared.of, 3U);
    EXPECT_EQ(both.side(1, 0).shared.count, 2U);
}

TEST(Agreement, OfALongEventWithThreeShortOnesIsOneAndThree) {
    const auto both = compare(list({{100, 400}}), list({{110, 120}, {200, 230}, {390, 500}, {600, 650}}));
    EXPECT_EQ(both.side(0, 1).shared.count, 1U);
    EXPECT_EQ(both.side(1, 0).shared.count, 3U);
    EXPECT_EQ(both.side(1, 0).shared.of, 4U);
}

TEST(Agreement, TakesEdgesFromThePartnerWithMostFramesInCommon) {
    const auto both = compare(list({{100, 400}}), list({{110, 120}, {200, 280}, {390, 500}}));
    EXPECT_EQ(both.side(0, 1).onset_difference_ms.median, 100.0);
    EXPECT_EQ(both.side(0, 1).end_difference_ms.median, -120.0);
}

TEST(Agreement, EdgeDifferencesArePositiveWhereTheOtherIsLater) {
    const auto both = compare(list({{100, 150}, {200, 250}, {300, 350}}), list({{103, 160}, {205, 260}, {301, 345}}));
    EXPECT_EQ(both.side(0, 1).onset_difference_ms.median, 3.0);
    EXPECT_EQ(both.side(0, 1).end_difference_ms.median, 10.0);
    EXPECT_EQ(both.side(1, 0).onset_difference_ms.median, -3.0);
}

TEST(Agreement, OfEmptyListsIsNotKnownRatherThanZero) {
    const auto both = compare({}, list({{1, 2}}));
    EXPECT_TRUE(std::isnan(both.side(0, 1).shared.share));
    EXPECT_EQ(both.side(1, 0).shared.count, 0U);
    EXPECT_TRUE(std::isnan(both.side(1, 0).onset_difference_ms.median));
    EXPECT_NE(agreement_table(both).find("a\tb\t0\t0\t0\tn/a"), std::string::npos);
}

TEST(Agreement, LeavesOutEventsInTimeThatNotAllJudged) {
    const auto both = compare(list({{100, 150}, {200, 250}}), list({{120, 130}, {249, 300}, {500, 510}}),
                              {{SampleIndex{250}, SampleIndex{260}}});
    EXPECT_EQ(both.left_out, 2U); // 200-250 touches frame 250
    EXPECT_EQ(both.side(0, 1).shared.of, 1U);
    EXPECT_EQ(both.side(1, 0).shared.of, 2U);
}

TEST(Agreement, OfAPersonsLabelsTellsFoundMissedAndExtraWithBothIntervals) {
    const auto both = compare(list({{100, 150}, {200, 250}, {300, 350}, {400, 400}}),
                              list({{105, 140}, {210, 240}, {395, 420}, {600, 650}, {700, 750}}), {}, true);
    const auto& found = both.side(0, 1);
    EXPECT_EQ(found.shared.count, 3U);
    EXPECT_EQ(found.shared.of, 4U);
    // Wilson 1927 for 3 of 4 and for 3 of 5 at 95 %: scipy.stats.binomtest(3, n).proportion_ci(method='wilson').
    EXPECT_NEAR(found.shared.low, 0.300642, 1e-5);
    EXPECT_NEAR(found.shared.high, 0.954413, 1e-5);
    EXPECT_NEAR(both.side(1, 0).shared.low, 0.230724, 1e-5);
    EXPECT_NEAR(both.side(1, 0).shared.high, 0.882379, 1e-5);
    EXPECT_EQ(found.onset_difference_ms.median, 5.0); // of 5, 10 and -5
    EXPECT_EQ(found.end_difference_ms.count, 2U);     // the label of one frame has no end
    const auto text = agreement_text(both, Hertz{1000.0});
    EXPECT_NE(text.find("3 of 4, 75.0 % (30.1 to 95.4)"), std::string::npos) << text;
    EXPECT_NE(text.find("3 of 5, 60.0 % (23.1 to 88.2)"), std::string::npos) << text;
}

TEST(Agreement, TableHasARowForEveryOrderedPair) {
    const auto three =
        agreement_of({{"a", list({{1, 5}}), false}, {"b", list({{4, 9}}), false}, {"c", {}, false}}, {}, Hertz{1000.0});
    std::istringstream lines(agreement_table(three));
    std::size_t count = 0;
    for (std::string line; std::getline(lines, line); ++count) {
        EXPECT_EQ(std::count(line.begin(), line.end(), '\t'), 9);
    }
    EXPECT_EQ(count, 1U + 6U);
    EXPECT_EQ(agreement_json(three, Hertz{1000.0})["pairs"].size(), 6U);
}

TEST(Intervals, WithoutOthersKeepWhatIsLeftOnBothSides) {
    const auto at = [](std::uint64_t from, std::uint64_t to) { return Interval{SampleIndex{from}, SampleIndex{to}}; };
    EXPECT_EQ(without({at(0, 100), at(200, 300)}, {at(10, 20), at(90, 210), at(300, 400)}),
              (Intervals{at(0, 10), at(20, 90), at(210, 300)}));
    EXPECT_EQ(without({at(10, 20)}, {at(0, 100)}), Intervals{});
    EXPECT_EQ(without({at(0, 5), at(6, 9)}, {}), (Intervals{at(0, 5), at(6, 9)}));
    EXPECT_EQ(without({at(0, 10), at(12, 30)}, {at(5, 20)}), (Intervals{at(0, 5), at(20, 30)}));
    EXPECT_EQ(union_of({at(0, 5), at(20, 30)}, {at(5, 7), at(25, 40)}), (Intervals{at(0, 7), at(20, 40)}));
    EXPECT_TRUE(touches({at(5, 10)}, SampleIndex{9}, SampleIndex{20}));
    EXPECT_FALSE(touches({at(5, 10)}, SampleIndex{10}, SampleIndex{20}));
    EXPECT_FALSE(touches({at(5, 10)}, SampleIndex{0}, SampleIndex{4}));
}

} // namespace
} // namespace millpond
