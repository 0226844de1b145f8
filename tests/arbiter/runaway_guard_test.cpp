#include "arbiter/runaway_guard.hpp"
#include "base/random.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // one frame a millisecond

RunawayGuard guard_of(const RunawaySettings& settings = {}) {
    return RunawayGuard::make(settings, rate);
}

/// False alarms an hour at `bound`, and at one fewer.
std::vector<double> ask_scipy_alarms(double per_s, double window_s, std::uint32_t bound) {
    return test::ask_scipy("r, w, n = x\ntell([3600 * r * stats.poisson.sf(n - 1 - 1 - i, r * w) for i in (0, 1)])",
                           std::vector<double>{per_s, window_s, static_cast<double>(bound)});
}

// Checked against: SciPy's Poisson law (scipy.stats.poisson.sf).
TEST(RunawayBound, IsTheLeastCountThatChanceGivesRarelyEnough) {
    MILLPOND_NEEDS_SCIPY();
    struct Case {
        double per_s, window_s, per_hour;
    };
    for (const auto& [per_s, window_s, per_hour] :
         {Case{1.5, 20.0, 1e-6}, {0.6, 10.0, 1e-3}, {4.0, 1.0, 1e-9}, {20.0, 600.0, 1e-12}, {0.001, 0.1, 1.0}}) {
        const auto alarms = ask_scipy_alarms(per_s, window_s, runaway_bound(per_s, window_s, per_hour));
        ASSERT_EQ(alarms.size(), 2U);
        EXPECT_LE(alarms[0], per_hour) << per_s;
        EXPECT_GT(alarms[1], per_hour) << per_s << ": one fewer would do";
    }
}

TEST(RunawayBound, ForTheDefaultsIsTheOneThatReadmeNames) {
    EXPECT_EQ(guard_of().most_in_window(), 72U) << "SciPy's Poisson law gives the same";
}

TEST(RunawayGuard, TooManyTriggersInAWindowAreARunawayAndOneFewerIsNot) {
    auto guard = guard_of();
    const auto most = guard.most_in_window();
    std::uint64_t at = 0;
    for (std::uint32_t i = 1; i < most; ++i) {
        at += i % 2 == 0 ? 170 : 230; // no equal intervals
        EXPECT_FALSE(guard.judged(SampleIndex{at}, Rule::none)) << i;
    }
    EXPECT_TRUE(guard.judged(SampleIndex{at + 170}, Rule::none));
}

TEST(RunawayGuard, DetectionsThatOnlyALimitWithheldCountTooAndOthersDoNot) {
    auto guard = guard_of();
    bool runaway = false;
    for (std::uint64_t i = 1; i <= guard.most_in_window(); ++i) {
        runaway = guard.judged(SampleIndex{i * 200}, Rule::second_limit);
    }
    EXPECT_TRUE(runaway);
    guard.reset();
    for (const auto rule : {Rule::lock_out, Rule::gate, Rule::not_armed, Rule::gap, Rule::veto, Rule::unsettled}) {
        for (std::uint64_t i = 1; i <= 200; ++i) {
            EXPECT_FALSE(guard.judged(SampleIndex{i * 100}, rule));
        }
    }
}

TEST(RunawayGuard, EqualIntervalsInARowAreARunaway) {
    RunawaySettings settings;
    settings.equal_intervals = 5;
    settings.equal_within_ms = 4.0;
    auto guard = guard_of(settings);
    // An artefact leads to the next detection 160 ms later, give or take 2 ms.
    const std::uint64_t places[] = {1000, 1160, 1318, 1480, 1639, 1799};
    for (std::size_t i = 0; i < 5; ++i) {
        EXPECT_FALSE(guard.judged(SampleIndex{places[i]}, Rule::none)) << i;
    }
    EXPECT_TRUE(guard.judged(SampleIndex{places[5]}, Rule::none)) << "the fifth equal interval";
}

TEST(RunawayGuard, OneOtherIntervalEndsARowAndLongOnesAreNeverTaken) {
    RunawaySettings settings;
    settings.equal_intervals = 5;
    auto guard = guard_of(settings);
    std::uint64_t at = 0;
    for (int i = 0; i < 100; ++i) {
        at += i % 5 == 4 ? 170 : 160;
        EXPECT_FALSE(guard.judged(SampleIndex{at}, Rule::none)) << i;
        at += i % 20 == 19 ? 20'000 : 0; // else the rate would be too high
    }
    for (int i = 0; i < 100; ++i) {
        at += 1000; // a metronome in the room, not a pulse's echo
        EXPECT_FALSE(guard.judged(SampleIndex{at}, Rule::none)) << i;
    }
}

TEST(RunawayGuard, AfterAResetItBeginsAnew) {
    RunawaySettings settings;
    settings.equal_intervals = 3;
    auto guard = guard_of(settings);
    for (const std::uint64_t at : {0, 200, 400}) {
        EXPECT_FALSE(guard.judged(SampleIndex{at}, Rule::none));
    }
    guard.reset();
    for (const std::uint64_t at : {600, 800, 1000}) {
        EXPECT_FALSE(guard.judged(SampleIndex{at}, Rule::none));
    }
    EXPECT_TRUE(guard.judged(SampleIndex{1200}, Rule::none));
}

TEST(RunawayGuard, SwitchedOffSeesNothing) {
    RunawaySettings settings;
    settings.on = false;
    auto guard = guard_of(settings);
    for (std::uint64_t i = 0; i < 1000; ++i) {
        EXPECT_FALSE(guard.judged(SampleIndex{i * 160}, Rule::none));
    }
}

// Random triggers at the expected rate for 2,000 hours, at which at most 0.2 alarms an hour were asked for: 400 at
// most.
TEST(RunawayGuard, ChanceAloneGivesNoMoreAlarmsThanAskedFor) {
    RunawaySettings settings;
    settings.false_alarms_per_hour = 0.2;
    settings.equal_below_ms = 0.0;
    auto guard = guard_of(settings);
    Random random(11, 0);
    double at_ms = 0.0;
    std::uint64_t alarms = 0, triggers = 0;
    while (at_ms < 2000.0 * 3'600'000.0) {
        at_ms += random.exponential(1000.0 / settings.expected_per_s);
        ++triggers;
        if (guard.judged(SampleIndex{static_cast<std::uint64_t>(at_ms)}, Rule::none)) {
            ++alarms;
            guard.reset();
        }
    }
    EXPECT_LE(alarms, 400U);
    EXPECT_GT(alarms, 10U) << "else the bound would be far from what was asked for";
    EXPECT_GT(triggers, 10'000'000U);
}

} // namespace
} // namespace millpond
