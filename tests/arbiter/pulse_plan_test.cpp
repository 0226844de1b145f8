#include "arbiter/pulse_plan.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // one frame a millisecond
constexpr SampleIndex never{UINT64_MAX};

ArbiterSettings delayed(double least_ms, double most_ms) {
    ArbiterSettings settings;
    settings.condition = Condition::delayed;
    settings.delay.least_ms = least_ms;
    settings.delay.most_ms = most_ms;
    return settings;
}

std::vector<std::uint64_t> delays_of(const ArbiterSettings& settings, std::size_t triggers) {
    auto plan = PulsePlan::make(settings, rate);
    std::vector<std::uint64_t> delays;
    for (std::uint32_t i = 1; i <= triggers; ++i) {
        const SampleIndex at{i * 1000ULL};
        plan.take_trigger(at, i);
        EXPECT_EQ(plan.next().number, i);
        EXPECT_EQ(plan.next().from, at);
        delays.push_back(plan.next_due() - at);
        plan.done();
    }
    return delays;
}

TEST(PulsePlan, FixedDelayIsTheSameForEveryTrigger) {
    EXPECT_EQ(delays_of(delayed(200.0, 200.0), 5), std::vector<std::uint64_t>(5, 200));
}

TEST(PulsePlan, RandomDelaysFillTheirRangeEvenly) {
    const auto delays = delays_of(delayed(150.0, 249.0), 20000);
    const auto [least, most] = std::minmax_element(delays.begin(), delays.end());
    EXPECT_EQ(*least, 150U);
    EXPECT_EQ(*most, 249U);
    // Pearson's chi-squared over the 100 values: 99 degrees of freedom; 148.2 is its 99.9 % point (SciPy chi2.ppf).
    std::vector<double> counts(100);
    for (const auto delay : delays) {
        ++counts[delay - 150];
    }
    double chi2 = 0.0;
    for (const double count : counts) {
        chi2 += (count - 200.0) * (count - 200.0) / 200.0;
    }
    EXPECT_LT(chi2, 148.2);
}

TEST(PulsePlan, DrawsAreTheSameInEveryCondition) {
    auto settings = delayed(150.0, 250.0);
    const auto expected = delays_of(settings, 50);
    settings.delay.in_every_condition = true;
    for (const auto condition : {Condition::disrupt, Condition::none}) {
        settings.condition = condition;
        EXPECT_EQ(delays_of(settings, 50), expected);
    }
    settings.catch_share = 0.5;
    EXPECT_EQ(delays_of(settings, 50), expected) << "nor do catch trials move delays";
}

TEST(PulsePlan, WithoutDelayedPulsesToCompareWithThereAreNoSuchMoments) {
    auto plan = PulsePlan::make({}, rate);
    plan.take_trigger(SampleIndex{1000}, 1);
    EXPECT_EQ(plan.next_due(), never);
}

TEST(PulsePlan, CatchesTheChosenShareOfTriggers) {
    ArbiterSettings settings;
    settings.catch_share = 0.2;
    auto plan = PulsePlan::make(settings, rate);
    int caught = 0;
    for (std::uint32_t i = 1; i <= 10000; ++i) {
        caught += plan.take_trigger(SampleIndex{i * 1000ULL}, i) ? 1 : 0;
    }
    EXPECT_NEAR(caught, 2000, 4 * 40); // four deviations of the binomial law
}

TEST(PulsePlan, LaterTriggerWithShorterDelayIsDueFirst) {
    auto settings = delayed(100.0, 1000.0);
    auto plan = PulsePlan::make(settings, rate);
    for (std::uint32_t i = 1; i <= 20; ++i) {
        plan.take_trigger(SampleIndex{1000ULL + i * 10}, i);
    }
    SampleIndex before{};
    for (int i = 0; i < 20; ++i) {
        EXPECT_GE(plan.next_due(), before);
        before = plan.next_due();
        plan.done();
    }
    EXPECT_EQ(plan.next_due(), never);
}

TEST(PulsePlan, HeldMomentComesBackUntilItHasWaitedLongEnough) {
    auto settings = delayed(200.0, 200.0);
    settings.hold.longest_ms = 5.0;
    auto plan = PulsePlan::make(settings, rate);
    plan.take_trigger(SampleIndex{1000}, 1);
    for (std::uint64_t now = 1200; now < 1205; ++now) {
        ASSERT_EQ(plan.next_due(), SampleIndex{now});
        EXPECT_TRUE(plan.hold(SampleIndex{now}));
        EXPECT_EQ(plan.next().planned, SampleIndex{1200});
    }
    EXPECT_FALSE(plan.hold(SampleIndex{1205}));
}

TEST(PulsePlan, HeldMomentLetsOthersPass) {
    auto settings = delayed(200.0, 200.0);
    auto plan = PulsePlan::make(settings, rate, {SampleIndex{1200}, SampleIndex{1300}});
    plan.take_trigger(SampleIndex{1000}, 1);
    EXPECT_EQ(plan.next().origin, PulseOrigin::delay);
    EXPECT_TRUE(plan.hold(SampleIndex{1200}));
    EXPECT_EQ(plan.next().origin, PulseOrigin::schedule);
    EXPECT_EQ(plan.next().number, 1U);
    EXPECT_TRUE(plan.hold(SampleIndex{1200}));
    plan.done(); // the delayed one at 1201
    EXPECT_EQ(plan.next().due, SampleIndex{1201});
    EXPECT_EQ(plan.next().planned, SampleIndex{1200});
    plan.done();
    EXPECT_EQ(plan.next_due(), SampleIndex{1300});
}

TEST(PulsePlan, PulsesOfTwoConditionsCannotMeetWhereOneTakesOverFromTheOther) {
    auto settings = delayed(200.0, 200.0);
    settings.lockout_ms = 150.0;
    auto plan = PulsePlan::make(settings, rate);
    plan.assign({Condition::delayed, Condition::delayed, Condition::disrupt});
    EXPECT_EQ(plan.begin_unit(SampleIndex{0}), (std::pair{1U, true}));
    EXPECT_TRUE(plan.gives(PulseOrigin::delay, SampleIndex{0})) << "the first has nothing before it";
    plan.take_trigger(SampleIndex{1000}, 1);
    plan.begin_unit(SampleIndex{1010});
    EXPECT_FALSE(plan.gives(plan.next(), SampleIndex{1200})) << "its trigger was another unit's";
    plan.done();
    plan.take_trigger(SampleIndex{1100}, 2);
    EXPECT_TRUE(plan.gives(plan.next(), SampleIndex{1300}));
    plan.begin_unit(SampleIndex{2000});
    EXPECT_FALSE(plan.gives(PulseOrigin::trigger, SampleIndex{2149}));
    EXPECT_TRUE(plan.gives(PulseOrigin::trigger, SampleIndex{2150}));
    EXPECT_EQ(plan.begin_unit(SampleIndex{3000}), (std::pair{4U, false})) << "beyond the list";
    EXPECT_FALSE(plan.gives(PulseOrigin::trigger, SampleIndex{4000}));
}

TEST(PulsePlan, EachConditionGivesPulsesAtMomentsOfOneOrigin) {
    const auto gives = [](Condition condition) {
        ArbiterSettings settings;
        settings.condition = condition;
        const auto plan = PulsePlan::make(settings, rate);
        return std::vector{plan.gives(PulseOrigin::trigger, {}), plan.gives(PulseOrigin::delay, {}),
                           plan.gives(PulseOrigin::schedule, {})};
    };
    EXPECT_EQ(gives(Condition::disrupt), (std::vector{true, false, false}));
    EXPECT_EQ(gives(Condition::delayed), (std::vector{false, true, false}));
    EXPECT_EQ(gives(Condition::yoked), (std::vector{false, false, true}));
    EXPECT_EQ(gives(Condition::rate_matched), (std::vector{false, false, true}));
    EXPECT_EQ(gives(Condition::none), (std::vector{false, false, false}));
}

} // namespace
} // namespace millpond
