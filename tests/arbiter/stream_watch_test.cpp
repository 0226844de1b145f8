#include "arbiter/fault_watch.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0};

LimitsSettings gaps_of(std::uint32_t most, double lost_percent) {
    LimitsSettings settings;
    settings.max_gaps_per_minute = most;
    settings.max_lost_percent = lost_percent;
    return settings;
}

TEST(GapWatch, MoreGapsThanAllowedWithinAMinuteAreTooMany) {
    auto watch = GapWatch::make(gaps_of(3, 100.0), rate);
    EXPECT_FALSE(watch.gap(SampleIndex{1'000}, 1));
    EXPECT_FALSE(watch.gap(SampleIndex{20'000}, 1));
    EXPECT_FALSE(watch.gap(SampleIndex{40'000}, 1));
    EXPECT_TRUE(watch.gap(SampleIndex{60'500}, 1)) << "the fourth within 60 s";
}

TEST(GapWatch, GapsOlderThanAMinuteAreForgotten) {
    auto watch = GapWatch::make(gaps_of(3, 100.0), rate);
    for (std::uint64_t at = 1'000; at < 3'600'000; at += 20'000) {
        EXPECT_FALSE(watch.gap(SampleIndex{at}, 1)) << at;
    }
}

TEST(GapWatch, ALargerShareLostThanAllowedIsTooMuch) {
    auto watch = GapWatch::make(gaps_of(0, 10.0), rate);
    EXPECT_FALSE(watch.gap(SampleIndex{10'000}, 3'000)) << "5 % of a minute";
    EXPECT_FALSE(watch.gap(SampleIndex{20'000}, 3'000)) << "10 %";
    EXPECT_TRUE(watch.gap(SampleIndex{30'000}, 1));
}

TEST(GapWatch, OneGapLongerThanAMinuteIsTooMuchAndIsForgottenLikeAnyOther) {
    auto watch = GapWatch::make(gaps_of(0, 10.0), rate);
    EXPECT_TRUE(watch.gap(SampleIndex{5'500}, 3'000'000));
    EXPECT_TRUE(watch.gap(SampleIndex{3'005'600}, 1));
    EXPECT_FALSE(watch.gap(SampleIndex{3'100'000}, 1));
}

TEST(GapWatch, WithoutLimitsNothingIsTooMuch) {
    auto watch = GapWatch::make(gaps_of(0, 100.0), rate);
    for (std::uint64_t at = 0; at < 100'000; at += 10) {
        EXPECT_FALSE(watch.gap(SampleIndex{at}, 9));
    }
}

/// The mean plays no part: that of the evidence may be anything.
FloorDetail settled(double deviation, std::uint16_t site = 65535, bool gates_closed = false) {
    return {-7.0, deviation, 0.0F, site, 1, 1000, gates_closed ? 1U : 0U};
}

FloorWatch watch_of(const FloorLimitSettings& settings, std::size_t floors = 1) {
    auto watch = FloorWatch::make(settings);
    watch.expect(floors);
    return watch;
}

TEST(FloorWatch, LeavesTheRangeInMicrovolts) {
    auto watch = watch_of({5.0, 50.0, 0.0, 1e6, {}});
    EXPECT_FALSE(watch.floor(0, settled(10.0)));
    EXPECT_FALSE(watch.floor(0, settled(5.0)));
    EXPECT_TRUE(watch.floor(0, settled(4.9)));
    EXPECT_TRUE(watch.floor(0, settled(50.1)));
    EXPECT_TRUE(watch.floor(0, settled(std::nan(""))));
}

TEST(FloorWatch, LeavesTheRangeOfWhatItWasWhenItHadSettled) {
    auto watch = watch_of({0.0, 1e5, 0.5, 3.0, {}});
    FloorDetail unsettled = settled(1000.0);
    unsettled.settled = 0;
    EXPECT_FALSE(watch.floor(0, unsettled));
    EXPECT_FALSE(watch.floor(0, settled(10.0)));
    EXPECT_FALSE(watch.floor(0, settled(30.0)));
    EXPECT_TRUE(watch.floor(0, settled(30.1)));
    EXPECT_TRUE(watch.floor(0, settled(4.9)));
    EXPECT_FALSE(watch.floor(0, settled(25.0, 65535, true))) << "time with a gate closed has a memory of its own";
}

TEST(FloorWatch, AChannelMayHaveARangeOfItsOwn) {
    auto watch = watch_of({5.0, 50.0, 0.0, 1e6, {{2, 1.0, 8.0}}}, 2);
    EXPECT_FALSE(watch.floor(0, settled(20.0, 0)));
    EXPECT_TRUE(watch.floor(1, settled(20.0, 1))) << "channel 2 of the stream";
    EXPECT_FALSE(watch.floor(1, settled(2.0, 1)));
}

TEST(FaultWatch, KeepsTheFirstFaultUntilItIsTakenAndArmingForgetsAll) {
    auto watch = FaultWatch::make(gaps_of(1, 100.0), rate);
    watch.expect_floors(1);
    EXPECT_FALSE(watch.take());
    watch.gap(SampleIndex{0}, 1);
    watch.gap(SampleIndex{10}, 1);
    watch.floor(0, settled(1e6));
    EXPECT_EQ(watch.take(), StateCause::too_many_gaps);
    EXPECT_FALSE(watch.take());
    watch.gap(SampleIndex{20}, 1);
    watch.armed();
    EXPECT_FALSE(watch.take());
    watch.gap(SampleIndex{30}, 1);
    EXPECT_FALSE(watch.take()) << "the one gap since";
}

} // namespace
} // namespace millpond
