#include "arbiter/arbiter.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // one frame a millisecond

ArbiterSettings settings_with(double lockout_ms, std::uint32_t per_second, std::uint32_t per_session) {
    ArbiterSettings settings;
    settings.lockout_ms = lockout_ms;
    settings.limits.max_pulses_per_second = per_second;
    settings.limits.max_pulses_per_session = per_session;
    return settings;
}

Arbiter armed(const ArbiterSettings& settings) {
    auto arbiter = Arbiter::make(settings, rate);
    arbiter.set_state(ArmState::armed);
    return arbiter;
}

Candidate at(std::uint64_t ms) {
    return {SampleIndex{ms}};
}

TEST(Arbiter, StartsNotArmedAndRefusesUntilArmed) {
    auto arbiter = Arbiter::make({}, rate);
    EXPECT_EQ(arbiter.state(), ArmState::not_armed);
    EXPECT_EQ(arbiter.judge(at(1000)), Rule::not_armed);
    arbiter.set_state(ArmState::armed);
    EXPECT_EQ(arbiter.judge(at(2000)), Rule::none);
}

TEST(Arbiter, RefusesWhileFaultedWhateverElseHolds) {
    auto arbiter = armed({});
    arbiter.set_state(ArmState::faulted);
    EXPECT_EQ(arbiter.judge(at(1000)), Rule::faulted);
}

TEST(Arbiter, LockOutCountsFromTheLastTriggerNotFromRefusedOnes) {
    auto arbiter = armed(settings_with(150.0, 100, 100));
    EXPECT_EQ(arbiter.judge(at(1000)), Rule::none);
    EXPECT_EQ(arbiter.judge(at(1149)), Rule::lock_out);
    EXPECT_EQ(arbiter.judge(at(1150)), Rule::none);
}

TEST(Arbiter, NeverMoreThanTheLimitInAnySecond) {
    auto arbiter = armed(settings_with(0.0, 3, 1000));
    std::vector<std::uint64_t> triggers;
    for (std::uint64_t ms = 1000; ms < 5000; ms += 70) {
        if (arbiter.judge(at(ms)) == Rule::none) {
            triggers.push_back(ms);
        }
    }
    ASSERT_GT(triggers.size(), 9U);
    for (std::size_t i = 3; i < triggers.size(); ++i) {
        EXPECT_GE(triggers[i] - triggers[i - 3], 1000U);
    }
    EXPECT_EQ(arbiter.judge(at(5000)), Rule::second_limit);
}

TEST(Arbiter, StopsAtTheSessionsLimit) {
    auto arbiter = armed(settings_with(0.0, 100, 2));
    EXPECT_EQ(arbiter.judge(at(1000)), Rule::none);
    EXPECT_EQ(arbiter.judge(at(3000)), Rule::none);
    EXPECT_EQ(arbiter.judge(at(60000)), Rule::session_limit);
    EXPECT_EQ(arbiter.triggers(), 2U);
}

TEST(Arbiter, ClosedGateRefusesAndItsNameMustBeKnown) {
    ArbiterSettings settings;
    settings.gates = {{"immobile", false}, {"region", true}};
    auto arbiter = armed(settings);
    EXPECT_EQ(arbiter.judge(at(1000)), Rule::gate);
    EXPECT_TRUE(arbiter.set_gate("immobile", true));
    EXPECT_FALSE(arbiter.set_gate("speed", true));
    EXPECT_EQ(arbiter.judge(at(2000)), Rule::none);
    EXPECT_TRUE(arbiter.set_gate("region", false));
    EXPECT_EQ(arbiter.judge(at(4000)), Rule::gate);
}

TEST(Arbiter, NamesTheFirstRuleThatAppliesInItsStatedOrder) {
    ArbiterSettings settings = settings_with(1e4, 1, 1);
    settings.gates = {{"g", false}};
    auto arbiter = armed(settings);
    arbiter.set_gate("g", true);
    ASSERT_EQ(arbiter.judge(at(1)), Rule::none);
    arbiter.set_gate("g", false);
    arbiter.set_state(ArmState::faulted);
    Candidate all{SampleIndex{1000}, true, true, true};
    EXPECT_EQ(arbiter.judge(all), Rule::gap);
    all.settling = false;
    EXPECT_EQ(arbiter.judge(all), Rule::unsettled);
    all.unsettled = false;
    EXPECT_EQ(arbiter.judge(all), Rule::veto);
    all.vetoed = false;
    EXPECT_EQ(arbiter.judge(all), Rule::faulted);
    arbiter.set_state(ArmState::not_armed);
    EXPECT_EQ(arbiter.judge(all), Rule::not_armed);
    arbiter.set_state(ArmState::armed);
    EXPECT_EQ(arbiter.judge(all), Rule::gate);
    arbiter.set_gate("g", true);
    EXPECT_EQ(arbiter.judge(all), Rule::lock_out);
    all.at = SampleIndex{20000};
    EXPECT_EQ(arbiter.judge(all), Rule::session_limit);
}

TEST(Arbiter, MomentsOfEachOriginHaveLimitsOfTheirOwn) {
    auto arbiter = armed(settings_with(150.0, 100, 2));
    ASSERT_EQ(arbiter.judge(at(1000)), Rule::none);
    EXPECT_EQ(arbiter.judge_slot(at(1010), PulseOrigin::schedule), Rule::none) << "a trigger locks no schedule out";
    EXPECT_EQ(arbiter.judge_slot(at(1020), PulseOrigin::delay), Rule::none);
    EXPECT_EQ(arbiter.judge_slot(at(1030), PulseOrigin::schedule), Rule::lock_out);
    EXPECT_EQ(arbiter.judge(at(1150)), Rule::none) << "nor do moments lock detections out";
    EXPECT_EQ(arbiter.triggers(), 2U);
    EXPECT_EQ(arbiter.judge_slot(at(2000), PulseOrigin::schedule), Rule::none);
    EXPECT_EQ(arbiter.judge_slot(at(3000), PulseOrigin::schedule), Rule::session_limit);
}

TEST(Arbiter, GivesNoMomentToAnyoneWhileNotArmedOrAGateIsClosed) {
    ArbiterSettings settings;
    settings.gates = {{"immobile", false}};
    auto arbiter = armed(settings);
    EXPECT_EQ(arbiter.judge_slot(at(1000), PulseOrigin::delay), Rule::gate);
    arbiter.set_gate("immobile", true);
    arbiter.set_state(ArmState::not_armed);
    EXPECT_EQ(arbiter.judge_slot(at(1000), PulseOrigin::delay), Rule::not_armed);
}

} // namespace
} // namespace millpond
