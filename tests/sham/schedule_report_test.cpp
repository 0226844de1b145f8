#include "base/random.hpp"
#include "base/refusal.hpp"
#include "sham/rate_matched.hpp"
#include "sham/schedule_report.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // a frame is 1 ms

Schedule at(std::initializer_list<std::uint64_t> frames) {
    Schedule places;
    for (const auto frame : frames) {
        places.push_back(SampleIndex{frame});
    }
    return places;
}

Ripple ripple(std::uint64_t onset, std::uint64_t end) {
    return {SampleIndex{onset}, SampleIndex{onset}, SampleIndex{end}, 0.0};
}

TEST(ScheduleReport, SaysCountRateAndIntervals) {
    const auto report = report_on(at({1000, 2000, 3500, 3700, 7000}), {}, {}, rate);
    EXPECT_EQ(report.places, 5U);
    EXPECT_DOUBLE_EQ(report.rate_per_s, 4.0 / 6.0);
    EXPECT_DOUBLE_EQ(report.intervals_s.median, 1.25); // of 0.2, 1, 1.5, 3.3
    EXPECT_DOUBLE_EQ(report.intervals_s.quartile1, 0.8);
    EXPECT_DOUBLE_EQ(report.intervals_s.quartile3, 1.95);
    EXPECT_DOUBLE_EQ(report.intervals_s.least, 0.2);
    const auto text = told(report);
    EXPECT_NE(text.find("places      5, from 1.000 to 7.000 s"), std::string::npos) << text;
    EXPECT_NE(text.find("with nothing: no source"), std::string::npos) << text;
    EXPECT_NE(text.find("share in ripples not known"), std::string::npos) << text;
}

TEST(ScheduleReport, TellsARegularSourceFromARandomSchedule) {
    RateMatchedPlan plan;
    plan.rate_per_s = 1.0;
    plan.duration_s = 300.0;
    ReportInput with;
    with.source_name = "session";
    for (std::uint64_t i = 0; i < 300; ++i) {
        with.source.push_back(SampleIndex{1000 * i});
    }
    const auto made = rate_matched_schedule(plan, rate);
    const auto report = report_on(made.places, {}, with, rate);
    EXPECT_LT(report.compared.p, 1e-6);
    EXPECT_NE(told(report).find("Kolmogorov-Smirnov, two-sided: D 0."), std::string::npos) << told(report);
    with.source = made.places;
    EXPECT_EQ(report_on(made.places, {}, with, rate).compared.d, 0.0);
}

TEST(RipplesTime, IsRateTimesMeanDuration) {
    // Onsets 2 s apart: 0.5 a second; 50 and 100 and 150 frames long.
    const auto time = ripple_time({ripple(1000, 1049), ripple(3000, 3099), ripple(5000, 5149)}, rate, "table");
    EXPECT_DOUBLE_EQ(time.rate_per_s, 0.5);
    EXPECT_DOUBLE_EQ(time.mean_duration_ms, 100.0);
    EXPECT_DOUBLE_EQ(time.share(), 0.05);
    EXPECT_THROW(static_cast<void>(ripple_time({ripple(1000, 1049)}, rate, "table")), Refusal);
    EXPECT_DOUBLE_EQ((RippleTime{20.0, 100.0, {}}).share(), 1.0);
}

// 0.58 to 0.66 ripples a second of 96.7 ms on average (Deceuninck & Kloosterman 2024): 6 %.
TEST(RipplesTime, ForetellsTheShareOfRandomPlacesInRipples) {
    Random random(11, 0);
    Ripples ripples;
    for (double at_ms = 500.0; at_ms < 7'200'000.0; at_ms += 200.0 + random.exponential(1413.0)) {
        const auto onset = static_cast<std::uint64_t>(at_ms);
        ripples.push_back(ripple(onset, onset + 40 + static_cast<std::uint64_t>(random.uniform() * 113.0)));
    }
    RateMatchedPlan plan;
    plan.rate_per_s = 2.0;
    plan.duration_s = 7200.0;
    ReportInput with;
    with.ripples = ripples;
    with.ripple_time = ripple_time(ripples, rate, "table");
    const auto report = report_on(rate_matched_schedule(plan, rate).places, {}, with, rate);
    EXPECT_NEAR(with.ripple_time->share(), 0.06, 0.002);
    ASSERT_TRUE(report.inside.has_value());
    EXPECT_LT(report.inside->low, with.ripple_time->share());
    EXPECT_GT(report.inside->high, with.ripple_time->share());
}

TEST(InsideRipples, CountsBothEndsAndWhatComesEarly) {
    const Ripples ripples{ripple(100, 200), ripple(205, 300)};
    EXPECT_FALSE(inside(ripples, SampleIndex{99}));
    EXPECT_TRUE(inside(ripples, SampleIndex{100}));
    EXPECT_TRUE(inside(ripples, SampleIndex{200}));
    EXPECT_FALSE(inside(ripples, SampleIndex{201}));
    EXPECT_TRUE(inside(ripples, SampleIndex{300}));
    EXPECT_FALSE(inside(ripples, SampleIndex{301}));
    EXPECT_TRUE(inside(ripples, SampleIndex{90}, 10));
    EXPECT_FALSE(inside(ripples, SampleIndex{89}, 10));
    EXPECT_TRUE(inside(ripples, SampleIndex{198}, 10)) << "of the first, although the second comes early there";
}

} // namespace
} // namespace millpond
