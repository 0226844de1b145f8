#include "referee/eligible_time.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr Hertz rate{1000.0}; // a frame is 1 ms
constexpr SampleIndex start{0}, end{60000};

Event floor_at(std::uint64_t sample, bool settled, std::uint16_t site = 0) {
    return Event::make(EventKind::floor, 0, SampleIndex{sample},
                       FloorDetail{1.0, 1.0, 4.0F, site, static_cast<std::uint16_t>(settled), 0});
}
Event trigger_at(std::uint64_t sample) {
    return Event::make(EventKind::trigger, 0, SampleIndex{sample}, TriggerDetail{sample, 1, {}, 0, 0});
}
Event gap_at(std::uint64_t sample, std::uint64_t frames) {
    return Event::make(EventKind::gap, 1, SampleIndex{sample}, GapDetail{frames});
}
Event state_at(std::uint64_t sample, ArmState state) {
    return Event::make(EventKind::state, static_cast<std::uint8_t>(state), SampleIndex{sample}, StateDetail{0, 1});
}
Event gate_at(std::uint64_t sample, bool open, char name = 'a') {
    return Event::make(EventKind::gate, 0, SampleIndex{sample}, GateDetail{static_cast<std::uint8_t>(open), {name}});
}
Event detection_at(std::uint64_t sample) {
    return Event::make(EventKind::detection, 0, SampleIndex{sample}, DetectionDetail{});
}
Event withheld_at(std::uint64_t sample, Rule rule) {
    return Event::make(EventKind::withheld, static_cast<std::uint8_t>(rule), SampleIndex{sample}, DetectionDetail{});
}

Interval from_to(std::uint64_t from, std::uint64_t to) {
    return {SampleIndex{from}, SampleIndex{to}};
}

Intervals eligible(const std::vector<Event>& events, const EligibleRules& rules = {}) {
    return eligible_time(events, rules, rate, start, end);
}
EligibleRules session_rules() {
    EligibleRules rules;
    rules.session = true;
    return rules;
}

TEST(EligibleTime, BeginsWithTheFirstFloorInWhichEverySiteHasSettled) {
    EXPECT_EQ(eligible({floor_at(0, false, 0), floor_at(0, false, 1), floor_at(1000, true, 0), floor_at(1000, false, 1),
                        floor_at(2000, true, 0), floor_at(2000, true, 1)}),
              (Intervals{from_to(2000, 60000)}));
}

TEST(EligibleTime, IsNoneWhereNothingWasEverSettled) {
    EXPECT_TRUE(eligible({}).empty());
    EXPECT_TRUE(eligible({floor_at(0, false), floor_at(1000, false)}).empty());
}

TEST(EligibleTime, LeavesOutAGapAndTheSettlingOfTheFiltersAfterIt) {
    EligibleRules rules;
    rules.settle_frames = 30;
    EXPECT_EQ(eligible({floor_at(0, true), gap_at(5000, 100)}, rules),
              (Intervals{from_to(30, 5000), from_to(5130, 60000)}));
}

TEST(EligibleTime, LeavesOutBlankingButNotTheFrameOfTheTriggerItself) {
    EligibleRules rules;
    rules.blanking_ms = 25.0;
    EXPECT_EQ(eligible({floor_at(0, true), trigger_at(5000)}, rules),
              (Intervals{from_to(0, 5001), from_to(5026, 60000)}));
}

TEST(EligibleTime, OfASessionLeavesOutLockOut) {
    auto rules = session_rules();
    rules.blanking_ms = 25.0;
    rules.lockout_ms = 150.0;
    const std::vector<Event> events{state_at(0, ArmState::armed), floor_at(0, true), trigger_at(5000)};
    EXPECT_EQ(eligible(events, rules), (Intervals{from_to(0, 5001), from_to(5150, 60000)}));
}

TEST(EligibleTime, OfASessionIsArmedTimeOnly) {
    const std::vector<Event> events{state_at(0, ArmState::not_armed), floor_at(0, true),
                                    state_at(1000, ArmState::armed), state_at(2000, ArmState::faulted),
                                    state_at(3000, ArmState::armed)};
    EXPECT_EQ(eligible(events, session_rules()), (Intervals{from_to(1000, 2000), from_to(3000, 60000)}));
    EXPECT_EQ(eligible(events), (Intervals{from_to(0, 60000)})); // a detector is scored armed or not
}

TEST(EligibleTime, OfASessionNeedsEveryGateOpen) {
    const std::vector<Event> events{state_at(0, ArmState::armed), gate_at(0, true, 'a'),
                                    gate_at(0, false, 'b'),       floor_at(0, true),
                                    gate_at(4000, true, 'b'),     gate_at(5000, false, 'a')};
    EXPECT_EQ(eligible(events, session_rules()), (Intervals{from_to(4000, 5000)}));
    EXPECT_EQ(eligible(events), (Intervals{from_to(0, 60000)}));
}

TEST(EligibleTime, IsCutToTheStretchAskedFor) {
    EXPECT_EQ(
        eligible_time(std::vector{floor_at(0, true), trigger_at(9000)}, {}, rate, SampleIndex{500}, SampleIndex{700}),
        (Intervals{from_to(500, 700)}));
}

TEST(EligibleTime, MomentsOfPulsesAreBlankedWhetherAPulseWasGivenOrNot) {
    EligibleRules rules;
    rules.blanking_ms = 40.0;
    const auto slot =
        Event::make(EventKind::slot, 0, SampleIndex{5000}, TriggerDetail{5000, 1, PulseOrigin::schedule, 0, 0});
    const auto clear = eligible({floor_at(0, true), slot}, rules);
    ASSERT_EQ(clear.size(), 2U);
    EXPECT_EQ(clear[0].to, SampleIndex{5000});
    EXPECT_EQ(clear[1].from - clear[0].to, frames_in_ms(40.0, rate));
}

TEST(Intervals, ContainTheirFirstFrameAndNotTheOneAfterTheLast) {
    const Intervals intervals{from_to(10, 20), from_to(30, 40)};
    EXPECT_FALSE(contains(intervals, SampleIndex{9}));
    EXPECT_TRUE(contains(intervals, SampleIndex{10}));
    EXPECT_TRUE(contains(intervals, SampleIndex{19}));
    EXPECT_FALSE(contains(intervals, SampleIndex{20}));
    EXPECT_TRUE(contains(intervals, SampleIndex{39}));
    EXPECT_EQ(frames_in(intervals), 20U);
}

TEST(Intervals, IntersectionIsWhatLiesInBoth) {
    EXPECT_EQ(intersection({from_to(10, 20), from_to(30, 40)}, {from_to(15, 35), from_to(38, 50)}),
              (Intervals{from_to(15, 20), from_to(30, 35), from_to(38, 40)}));
}

TEST(DetectionsToScore, LeaveOutWhatTheDetectorRefusedItselfAndKeepWhatTheArbiterRefused) {
    const std::vector<Event> events{
        detection_at(1), withheld_at(1, Rule::gap),  detection_at(2), withheld_at(2, Rule::unsettled),
        detection_at(3), withheld_at(3, Rule::veto), detection_at(4), withheld_at(4, Rule::lock_out),
        detection_at(5), withheld_at(5, Rule::gate), detection_at(6), trigger_at(6)};
    EXPECT_EQ(detections_to_score(events), (std::vector{SampleIndex{4}, SampleIndex{5}, SampleIndex{6}}));
}

} // namespace
} // namespace millpond
