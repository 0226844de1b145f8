#include "arbiter/session_plan.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0};
constexpr ChangedBy by_plan{ChangeSource::plan};

std::string name_of_epoch(const SessionPlan& plan) {
    return plan.detail(by_plan).name.data();
}

SessionPlan rest_track_rest(bool ends_session = false) {
    return SessionPlan::make({{{"rest 1", 20.0, false}, {"track", 40.0, true}, {"rest 2", 0.0, true}}, ends_session},
                             rate);
}

TEST(SessionPlan, WithoutOneAllIsOneEndlessEpochWithPulses) {
    const auto plan = SessionPlan::make({}, rate);
    EXPECT_FALSE(plan.present());
    EXPECT_TRUE(plan.pulses());
    EXPECT_FALSE(plan.over());
    EXPECT_EQ(plan.next_start(), SampleIndex{UINT64_MAX});
}

TEST(SessionPlan, EpochsFollowEachOtherByTheirLengths) {
    auto plan = rest_track_rest();
    plan.start(SampleIndex{500});
    EXPECT_EQ(name_of_epoch(plan), "rest 1");
    EXPECT_FALSE(plan.pulses());
    EXPECT_EQ(plan.next_start(), SampleIndex{500 + 20 * 60'000});
    plan.next(plan.next_start());
    EXPECT_EQ(name_of_epoch(plan), "track");
    EXPECT_TRUE(plan.pulses());
    EXPECT_EQ(plan.next_start(), SampleIndex{500 + 60 * 60'000});
}

TEST(SessionPlan, AnEpochWithoutALengthWaitsAndTheNextCountsFromWhenItWasTold) {
    auto plan = SessionPlan::make({{{"a", 0.0, true}, {"b", 1.0, true}}, false}, rate);
    plan.start(SampleIndex{0});
    EXPECT_EQ(plan.next_start(), SampleIndex{UINT64_MAX});
    EXPECT_EQ(plan.detail(by_plan).frames, 0U);
    plan.next(SampleIndex{7'777});
    EXPECT_EQ(plan.next_start(), SampleIndex{67'777});
}

TEST(SessionPlan, AfterTheLastEpochThereAreNoPulsesAndTheSessionEndsIfItIsTo) {
    for (const bool ends : {false, true}) {
        auto plan = rest_track_rest(ends);
        plan.start(SampleIndex{0});
        for (int i = 0; i < 3; ++i) {
            EXPECT_FALSE(plan.over());
            plan.next(SampleIndex{10});
        }
        EXPECT_TRUE(plan.over());
        EXPECT_FALSE(plan.pulses());
        EXPECT_EQ(plan.ends_session(), ends);
        EXPECT_EQ(name_of_epoch(plan), "after the plan");
        plan.next(SampleIndex{20});
        EXPECT_EQ(plan.detail(by_plan).index, 3U) << "nothing follows";
        EXPECT_EQ(plan.next_start(), SampleIndex{UINT64_MAX});
    }
}

} // namespace
} // namespace millpond
