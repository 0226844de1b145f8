#include "arbiter/pulse_limits.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <vector>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // one frame a millisecond

LimitsSettings wide() {
    LimitsSettings settings;
    settings.max_pulses_per_second = 1000;
    settings.max_pulses_per_minute = 60000;
    return settings;
}

/// Triggers of a limit at work on candidates every `step` ms of `seconds`.
std::vector<std::uint64_t> let_through(PulseLimits& limits, std::uint64_t step, std::uint64_t seconds) {
    std::vector<std::uint64_t> triggers;
    for (std::uint64_t ms = 0; ms < seconds * 1000; ms += step) {
        if (limits.refusal(SampleIndex{ms}) == Rule::none) {
            limits.count(SampleIndex{ms});
            triggers.push_back(ms);
        }
    }
    return triggers;
}

TEST(PulseLimits, NeverMoreThanTheLimitInAnyMinute) {
    auto settings = wide();
    settings.max_pulses_per_minute = 7;
    auto limits = PulseLimits::make(settings, 0.0, rate);
    const auto triggers = let_through(limits, 1300, 300);
    ASSERT_GT(triggers.size(), 30U);
    for (std::size_t i = 7; i < triggers.size(); ++i) {
        EXPECT_GE(triggers[i] - triggers[i - 7], 60'000U);
    }
    EXPECT_EQ(limits.refusal(SampleIndex{triggers.back() + 1300}), Rule::minute_limit);
}

TEST(PulseLimits, SecondAndMinuteAreKeptTogetherWhicheverAllowsMore) {
    auto settings = wide();
    settings.max_pulses_per_second = 9; // more than the minute's
    settings.max_pulses_per_minute = 5;
    auto limits = PulseLimits::make(settings, 0.0, rate);
    EXPECT_EQ(let_through(limits, 100, 60).size(), 5U);
    settings.max_pulses_per_second = 2;
    limits = PulseLimits::make(settings, 0.0, rate);
    EXPECT_EQ(let_through(limits, 100, 60), (std::vector<std::uint64_t>{0, 100, 1000, 1100, 2000}));
}

TEST(PulseLimits, AnEpochsCountBeginsAnewWithTheNext) {
    auto settings = wide();
    settings.max_pulses_per_epoch = 3;
    auto limits = PulseLimits::make(settings, 0.0, rate);
    EXPECT_EQ(let_through(limits, 100, 1).size(), 3U);
    EXPECT_EQ(limits.refusal(SampleIndex{5000}), Rule::epoch_limit);
    limits.begin_epoch();
    EXPECT_EQ(limits.refusal(SampleIndex{5000}), Rule::none);
}

TEST(PulseLimits, AnIntervalLongerThanTheLockOutHasARuleOfItsOwn) {
    auto settings = wide();
    settings.min_interval_ms = 400.0;
    auto limits = PulseLimits::make(settings, 150.0, rate);
    limits.count(SampleIndex{1000});
    EXPECT_EQ(limits.refusal(SampleIndex{1149}), Rule::lock_out);
    EXPECT_EQ(limits.refusal(SampleIndex{1150}), Rule::interval);
    EXPECT_EQ(limits.refusal(SampleIndex{1399}), Rule::interval);
    EXPECT_EQ(limits.refusal(SampleIndex{1400}), Rule::none);
}

TEST(PulseLimits, NamesTheFirstThatAppliesInTheOrderOfTheirNumbers) {
    LimitsSettings settings;
    settings.max_pulses_per_second = settings.max_pulses_per_minute = 1;
    settings.max_pulses_per_epoch = settings.max_pulses_per_session = 2;
    settings.min_interval_ms = 200'000.0;
    auto limits = PulseLimits::make(settings, 150.0, rate);
    limits.count(SampleIndex{0});
    EXPECT_EQ(limits.refusal(SampleIndex{149}), Rule::lock_out);
    EXPECT_EQ(limits.refusal(SampleIndex{999}), Rule::second_limit);
    EXPECT_EQ(limits.refusal(SampleIndex{59'999}), Rule::minute_limit);
    EXPECT_EQ(limits.refusal(SampleIndex{60'000}), Rule::interval);
    limits.count(SampleIndex{300'000});
    EXPECT_EQ(limits.refusal(SampleIndex{301'000}), Rule::session_limit);
}

} // namespace
} // namespace millpond
