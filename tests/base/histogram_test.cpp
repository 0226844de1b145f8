#include "base/histogram.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

TEST(LatencyHistogram, EveryLatencyLiesInItsBinAndBinsAreNoWiderThanThreeHundredths) {
    std::uint32_t before = 0;
    for (std::int64_t ns = 0; ns < 40'000'000'000; ns += 1 + ns / 50) {
        const auto bin = LatencyHistogram::bin_of(ns);
        EXPECT_GE(bin, before);
        EXPECT_LE(ns, LatencyHistogram::upper_ns(bin));
        EXPECT_LE(static_cast<double>(LatencyHistogram::upper_ns(bin) - ns), 0.032 * static_cast<double>(ns) + 1.0);
        if (bin > 0) {
            EXPECT_GT(ns, LatencyHistogram::upper_ns(bin - 1));
        }
        before = bin;
    }
}

TEST(LatencyHistogram, QuantilesAreNeverTooGood) {
    LatencyHistogram histogram;
    for (std::int64_t us = 1; us <= 1000; ++us) {
        histogram.add(us * 1000);
    }
    EXPECT_GE(histogram.quantile_ns(0.5), 500'000);
    EXPECT_LE(histogram.quantile_ns(0.5), 520'000);
    EXPECT_GE(histogram.quantile_ns(0.99), 990'000);
    EXPECT_EQ(histogram.max_ns(), 1'000'000);
    EXPECT_EQ(histogram.count(), 1000U);
}

TEST(LatencyHistogram, CountsReadBackGiveTheSameQuantiles) {
    LatencyHistogram first, second;
    for (std::int64_t ns = 1; ns < 100'000; ns += 17) {
        first.add(ns * 3);
    }
    for (std::uint32_t bin = 0; bin < LatencyHistogram::bin_count; ++bin) {
        second.add_bin(bin, first.count_in(bin));
    }
    for (const double q : {0.1, 0.5, 0.9, 0.999}) {
        EXPECT_EQ(first.quantile_ns(q), second.quantile_ns(q));
    }
}

TEST(LatencyHistogram, EmptySaysNothingAndClocksThatDisagreeDoNotCrash) {
    LatencyHistogram histogram;
    EXPECT_EQ(histogram.quantile_ns(0.5), 0);
    histogram.add(-5);
    EXPECT_EQ(histogram.count_in(0), 1U);
    histogram.add(INT64_MAX);
    EXPECT_EQ(histogram.count(), 2U);
}

} // namespace
} // namespace millpond
