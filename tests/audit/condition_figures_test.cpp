#include "audit/condition_figures.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond::test {
namespace {

constexpr Hertz rate{1000.0};

Event trial(std::uint64_t at, std::uint32_t number, bool listed = true) {
    return Event::make(EventKind::trial, 0, SampleIndex{at}, TrialDetail{number, listed ? 1U : 0U});
}
Event plain(EventKind kind, std::uint64_t at) {
    return Event::make(kind, 0, SampleIndex{at}, TriggerDetail{at, 1, PulseOrigin::trigger, 0, 0});
}

TEST(ConditionFigures, CountWhatFellIntoTheUnitsOfEachCondition) {
    const std::vector<Condition> list{Condition::disrupt, Condition::none, Condition::disrupt};
    const std::vector<Event> events{trial(0, 1),
                                    plain(EventKind::detection, 10'000),
                                    plain(EventKind::trigger, 10'000),
                                    plain(EventKind::order, 10'000),
                                    plain(EventKind::pulse, 10'000),
                                    trial(60'000, 2),
                                    plain(EventKind::detection, 70'000),
                                    plain(EventKind::trigger, 70'000),
                                    plain(EventKind::trigger, 75'000),
                                    trial(90'000, 3),
                                    plain(EventKind::detection, 100'000), // not eligible
                                    trial(120'000, 4, false),
                                    plain(EventKind::trigger, 130'000)}; // beyond the list
    const Intervals eligible{{SampleIndex{0}, SampleIndex{90'000}}};
    const auto figures = condition_figures(events, list, eligible, rate, SampleIndex{150'000});
    ASSERT_EQ(figures.size(), 2U);
    EXPECT_EQ(figures[0].condition, Condition::disrupt);
    EXPECT_EQ(figures[0].units, 2U);
    EXPECT_DOUBLE_EQ(figures[0].minutes, 1.5);
    EXPECT_DOUBLE_EQ(figures[0].eligible_minutes, 1.0);
    EXPECT_EQ(figures[0].detections, 1U);
    EXPECT_EQ(figures[0].pulses, 1U);
    EXPECT_EQ(figures[1].triggers, 2U);
    EXPECT_EQ(figures[1].orders, 0U);
    EXPECT_EQ(figures[1].trigger_intervals_s, std::vector{5.0});
    EXPECT_DOUBLE_EQ(figures[1].detections_per_minute(), 2.0);
}

TEST(ConditionFigures, OfASessionWithoutAssignmentAreThoseOfItsOneCondition) {
    const std::vector<Condition> one{Condition::delayed};
    const std::vector<Event> events{plain(EventKind::trigger, 5)};
    const auto figures = condition_figures(events, one, {}, rate, SampleIndex{60'000});
    ASSERT_EQ(figures.size(), 1U);
    EXPECT_EQ(figures[0].triggers, 1U);
    EXPECT_DOUBLE_EQ(figures[0].minutes, 1.0);
}

// Published: Deceuninck & Kloosterman 2024 report rest detections of 0.69 /s disrupted and 0.49 /s sham; over ten
// minutes each such a difference is no chance.
TEST(SameRate, IsTheExactBinomialTestOfScipy) {
    MILLPOND_NEEDS_SCIPY();
    struct Case {
        std::uint64_t one;
        double one_minutes;
        std::uint64_t other;
        double other_minutes;
    };
    for (const auto& c : {Case{414, 10.0, 294, 10.0}, Case{30, 10.0, 25, 10.0}, Case{5, 1.0, 20, 3.0},
                          Case{0, 1.0, 3, 1.0}, Case{12, 7.0, 12, 7.0}}) {
        const auto expected = ask_scipy("tell(stats.binomtest(" + std::to_string(c.one) + ", " +
                                        std::to_string(c.one + c.other) + ", " + std::to_string(c.one_minutes) + " / " +
                                        std::to_string(c.one_minutes + c.other_minutes) + ").pvalue)");
        EXPECT_NEAR(same_rate_p(c.one, c.one_minutes, c.other, c.other_minutes), expected.at(0),
                    1e-9 + 1e-6 * expected.at(0));
    }
    EXPECT_LT(same_rate_p(414, 10.0, 294, 10.0), 0.001);
}

} // namespace
} // namespace millpond::test
