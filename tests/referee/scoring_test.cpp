#include "referee/scoring.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::ask_scipy;
using Places = std::vector<SampleIndex>;

constexpr Hertz rate{1000.0};                                  // a frame is 1 ms
const Intervals always{{SampleIndex{0}, SampleIndex{600000}}}; // 10 minutes

Ripple ripple(std::uint64_t onset, std::uint64_t end) {
    return {SampleIndex{onset}, SampleIndex{(onset + end) / 2}, SampleIndex{end}, 100.0};
}

Places at(std::initializer_list<std::uint64_t> frames) {
    Places places;
    for (const auto frame : frames) {
        places.push_back(SampleIndex{frame});
    }
    return places;
}

Score scored(const Ripples& ripples, const Places& detections, double early_ms = 0.0,
             const Intervals& eligible = always) {
    return score(ripples, detections, eligible, early_ms, rate);
}

TEST(Scoring, DetectionBelongsToARippleFromItsOnsetToItsEndBothIncluded) {
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({1000})).hits, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({1080})).hits, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({999})).false_detections, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({1081})).false_detections, 1U);
}

TEST(Scoring, EarlyAdmitsDetectionsThatFarBeforeTheOnset) {
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({990}), 10.0).hits, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({989}), 10.0).hits, 0U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({989}), 10.0).false_detections, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({990}), 10.0).early_ms, 10.0);
}

TEST(Scoring, FirstDetectionOfARippleIsAHitLaterOnesAreRepeatsNeitherHitsNorFalse) {
    const auto result = scored({ripple(1000, 1080)}, at({1010, 1040, 1070}));
    EXPECT_EQ(result.hits, 1U);
    EXPECT_EQ(result.repeats, 2U);
    EXPECT_EQ(result.false_detections, 0U);
    EXPECT_EQ(result.detections,
              (std::vector{DetectionOutcome::hit, DetectionOutcome::repeat, DetectionOutcome::repeat}));
}

TEST(Scoring, RippleWithoutADetectionIsAMiss) {
    const auto result = scored({ripple(1000, 1080), ripple(2000, 2080)}, at({2010}));
    EXPECT_EQ(result.misses, 1U);
    EXPECT_EQ(result.ripples, (std::vector{RippleOutcome::miss, RippleOutcome::hit}));
}

TEST(Scoring, OnlyRipplesWhoseOnsetLiesInEligibleTimeCount) {
    const Intervals eligible{{SampleIndex{1000}, SampleIndex{2000}}};
    const auto result =
        scored({ripple(990, 1050), ripple(1990, 2050), ripple(2060, 2100)}, at({1040, 2040, 2070}), 0.0, eligible);
    EXPECT_EQ(result.ripples, (std::vector{RippleOutcome::outside, RippleOutcome::hit, RippleOutcome::outside}));
    EXPECT_EQ(result.eligible_ripples, 1U);
    EXPECT_EQ(result.outside, 2U); // at 1040 and 2070, which belong to ripples that do not count
}

TEST(Scoring, DetectionOutsideEligibleTimeIsNotFalse) {
    const auto result = scored({}, at({500, 1500}), 0.0, {{SampleIndex{1000}, SampleIndex{2000}}});
    EXPECT_EQ(result.false_detections, 1U);
    EXPECT_EQ(result.outside, 1U);
}

TEST(Scoring, RippleWhoseOwnEarlyDetectionMadeItsOnsetIneligibleCounts) {
    // Trigger at 995, then lock-out over the onset at 1000.
    const Intervals eligible{{SampleIndex{0}, SampleIndex{996}}, {SampleIndex{1145}, SampleIndex{5000}}};
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({995}), 10.0, eligible).hits, 1U);
    EXPECT_EQ(scored({ripple(1000, 1080)}, at({}), 10.0, eligible).eligible_ripples, 0U);
}

TEST(Scoring, DetectionThatTwoRipplesWouldHaveBelongsToTheOneThatHasBegun) {
    const auto result = scored({ripple(1000, 1080), ripple(1085, 1150)}, at({1010, 1078}), 10.0);
    EXPECT_EQ(result.ripples, (std::vector{RippleOutcome::hit, RippleOutcome::miss}));
    EXPECT_EQ(result.repeats, 1U);
}

TEST(Scoring, FalsePerMinuteDividesByEligibleMinutes) {
    const auto result = scored({}, at({70000, 80000, 90000}), 0.0, {{SampleIndex{60000}, SampleIndex{180000}}});
    EXPECT_DOUBLE_EQ(result.eligible_minutes, 2.0);
    EXPECT_DOUBLE_EQ(result.false_per_minute, 1.5);
}

TEST(Scoring, HitRateIsHitsOverEligibleRipplesAndPrecisionCountsRepeatsAsRight) {
    const auto result = scored({ripple(1000, 1080), ripple(2000, 2080), ripple(3000, 3080), ripple(4000, 4080)},
                               at({1010, 1020, 2010, 2500, 3010}));
    EXPECT_EQ(result.hit_rate.count, 3U);
    EXPECT_EQ(result.hit_rate.of, 4U);
    EXPECT_DOUBLE_EQ(result.hit_rate.share, 0.75);
    EXPECT_EQ(result.precision.count, 4U); // three hits and a repeat
    EXPECT_EQ(result.precision.of, 5U);
}

TEST(Scoring, OnsetLatencyIsDecisionTimeMinusOnsetOverHits) {
    // By hand: latencies 20, 35, -5 ms; the repeat at 1050 and the false one at 2500 have none.
    const auto result =
        scored({ripple(1000, 1080), ripple(2000, 2070), ripple(3000, 3050)}, at({1020, 1050, 2035, 2500, 2995}), 10.0);
    EXPECT_EQ(result.onset_latency_ms.count, 3U);
    EXPECT_DOUBLE_EQ(result.onset_latency_ms.least, -5.0);
    EXPECT_DOUBLE_EQ(result.onset_latency_ms.median, 20.0);
    EXPECT_DOUBLE_EQ(result.onset_latency_ms.most, 35.0);
    EXPECT_DOUBLE_EQ(result.onset_latency_bins.from, -5.0);
    EXPECT_EQ(result.onset_latency_bins.counts, (std::vector<std::uint64_t>{1, 0, 0, 0, 0, 1, 0, 0, 1}));
}

TEST(Scoring, ElapsedShareIsLatencyOverDurationAndBeforeHalfCountsUpToAHalf) {
    // By hand: 20/80 = 0.25, 40/80 = 0.5, 60/80 = 0.75.
    const auto result = scored({ripple(1000, 1080), ripple(2000, 2080), ripple(3000, 3080)}, at({1020, 2040, 3060}));
    EXPECT_DOUBLE_EQ(result.elapsed_share.median, 0.5);
    EXPECT_EQ(result.before_half.count, 2U);
    EXPECT_EQ(result.before_half.of, 3U);
}

TEST(Scoring, WhatTheDataCannotGiveIsNotKnown) {
    const auto result = scored({}, {}, 0.0, {});
    EXPECT_TRUE(std::isnan(result.hit_rate.share));
    EXPECT_TRUE(std::isnan(result.precision.share));
    EXPECT_TRUE(std::isnan(result.false_per_minute));
    EXPECT_TRUE(std::isnan(result.onset_latency_ms.median));
}

TEST(WilsonInterval, EqualsScipys) {
    MILLPOND_NEEDS_SCIPY();
    const auto theirs = ask_scipy("for k, n in ((0, 10), (10, 10), (1, 3), (81, 263), (4500, 10000)):\n"
                                  "    ci = stats.binomtest(k, n).proportion_ci(method='wilson')\n"
                                  "    tell([k, n, ci.low, ci.high])");
    ASSERT_EQ(theirs.size(), 20U);
    for (std::size_t i = 0; i < theirs.size(); i += 4) {
        const auto ours = proportion(static_cast<std::uint64_t>(theirs[i]), static_cast<std::uint64_t>(theirs[i + 1]));
        EXPECT_NEAR(ours.low, theirs[i + 2], 1e-12);
        EXPECT_NEAR(ours.high, theirs[i + 3], 1e-12);
    }
}

TEST(WilsonInterval, MatchesAPublishedExample) {
    // Newcombe 1998, Stat Med 17:857, table I, method 3 (score): 81/263 gives 0.2553 to 0.3662 (from memory).
    const auto interval = proportion(81, 263);
    EXPECT_NEAR(interval.low, 0.2553, 5e-5);
    EXPECT_NEAR(interval.high, 0.3662, 5e-5);
}

TEST(Quantiles, EqualNumpys) {
    MILLPOND_NEEDS_SCIPY();
    const std::vector<double> values{31.2, 5.5, 17.0, 44.1, 9.9, 23.4, 60.2, 12.7, 18.8, 27.3, 3.1};
    const auto ours = distribution(values);
    const auto theirs = ask_scipy("tell(np.percentile(x, [0, 25, 50, 75, 90, 99, 100]))", values);
    const std::vector<double> all{ours.least, ours.quartile1, ours.median, ours.quartile3,
                                  ours.p90,   ours.p99,       ours.most};
    ASSERT_EQ(theirs.size(), all.size());
    for (std::size_t i = 0; i < all.size(); ++i) {
        EXPECT_NEAR(all[i], theirs[i], 1e-12);
    }
}

} // namespace
} // namespace millpond
