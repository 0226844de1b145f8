// Conditions differ in their pulses alone: everything else about them is the same, sample for sample.
#include "engine/engine.hpp"
#include "support/kept_decisions.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};
constexpr Condition all_conditions[] = {Condition::disrupt, Condition::delayed, Condition::yoked,
                                        Condition::rate_matched, Condition::none};

struct Kept : test::KeptDecisions {
    [[nodiscard]] std::vector<std::uint64_t> places(EventKind kind) const {
        std::vector<std::uint64_t> found;
        for (const auto& event : of(kind)) {
            found.push_back(event.sample.value);
        }
        return found;
    }
};

EngineSettings settings_for(Condition condition) {
    auto settings = test::quick_settings();
    settings.arbiter.condition = condition;
    settings.arbiter.delay.in_every_condition = true;
    return settings;
}

constexpr std::size_t burst_ms = 80;

/// A burst of 80 ms a second from 5 s on, on two channels.
std::vector<float> bursts(std::size_t seconds) {
    auto data = test::white_noise(seconds * 1250, 2, 20.0, 7);
    for (std::size_t second = 5; second < seconds; ++second) {
        test::add_burst(data, 2, second * 1250, burst_ms * 1250 / 1000, rate.value, 200.0, 250.0);
    }
    return data;
}

void feed(Engine& engine, const std::vector<float>& data, std::size_t from, std::size_t to, std::size_t block = 64) {
    const FrameBlock whole = test::block_of(data, 2);
    for (std::size_t at = from; at < to; at += block) {
        engine.process(whole.part(at, std::min(block, to - at)));
    }
}

Kept run(const EngineSettings& settings, const std::vector<float>& data, std::vector<SampleIndex> schedule = {},
         std::size_t block = 64) {
    Kept kept;
    Engine engine(Detector::make(settings.detector, ripple_channels(2), rate), settings.arbiter, std::move(schedule),
                  rate, kept, kept);
    engine.start(SampleIndex{0}, true);
    feed(engine, data, 0, data.size() / 2, block);
    engine.finish();
    return kept;
}

const std::vector<SampleIndex> some_places{{1000}, {7000}, {7100}, {8740}, {9000}, {20000}, {30000}};

TEST(Conditions, OnTheSameSamplesAllButTheOrdersIsTheSameInEveryCondition) {
    const auto data = bursts(40);
    const auto without_orders = [&](Condition condition) {
        auto settings = settings_for(condition);
        settings.arbiter.catch_share = 0.3;
        auto events = run(settings, data, some_places).events;
        std::erase_if(events, [](const Event& event) { return event.kind == EventKind::order; });
        return events;
    };
    const auto expected = without_orders(Condition::disrupt);
    EXPECT_GT(expected.size(), 100U);
    for (const auto condition : all_conditions) {
        EXPECT_EQ(without_orders(condition), expected) << word_for<Condition>(conditions, condition);
    }
}

TEST(Conditions, BlankingActsAtMomentsWithoutAPulseToo) {
    // Were it not so, the moments of other conditions could not be told from the samples: a burst there would be seen.
    auto data = test::white_noise(20 * 1250, 2, 20.0, 7);
    test::add_burst(data, 2, 10 * 1250, 20, rate.value, 200.0, 2000.0);
    auto settings = settings_for(Condition::none);
    settings.detector.blanking_ms = 60.0;
    EXPECT_EQ(run(settings, data).of(EventKind::detection).size(), 1U);
    const auto kept = run(settings, data, {SampleIndex{10 * 1250 - 10}});
    EXPECT_EQ(kept.of(EventKind::slot).size(), 1U);
    EXPECT_TRUE(kept.of(EventKind::detection).empty());
    EXPECT_TRUE(kept.orders.empty());
}

TEST(Conditions, DisruptOrdersAtEachTriggerAndMarksIt) {
    const auto kept = run(settings_for(Condition::disrupt), bursts(30));
    EXPECT_EQ(kept.orders.size(), 25U);
    EXPECT_EQ(kept.places(EventKind::order), kept.places(EventKind::trigger));
    EXPECT_EQ(kept.marks, kept.of(EventKind::trigger));
}

TEST(Conditions, NoneOrdersNothingAndMarksEachTriggerAllTheSame) {
    const auto kept = run(settings_for(Condition::none), bursts(30));
    EXPECT_TRUE(kept.orders.empty());
    EXPECT_EQ(kept.marks.size(), 25U);
}

TEST(Conditions, DelayedOrdersOnceForEachTriggerWithinItsRange) {
    const auto kept = run(settings_for(Condition::delayed), bursts(40));
    EXPECT_EQ(kept.orders.size(), 35U);
    for (const auto& order : kept.orders) {
        const auto detail = order.as<TriggerDetail>();
        EXPECT_EQ(detail.origin, PulseOrigin::delay);
        EXPECT_GE(order.sample.value - detail.from, frames_in_ms(150.0, rate));
        EXPECT_LE(order.sample.value - detail.from, frames_in_ms(250.0, rate));
    }
}

TEST(Conditions, DelayedPulseWaitsWhileTheRippleGoesOn) {
    auto settings = settings_for(Condition::delayed);
    settings.arbiter.delay = {30.0, 30.0, true}; // well inside the bursts
    settings.arbiter.hold = {20.0, 500.0, true};
    const auto kept = run(settings, bursts(30));
    ASSERT_EQ(kept.orders.size(), 25U);
    for (const auto& order : kept.orders) {
        const auto into_second = order.sample.value % 1250;
        EXPECT_GE(into_second, frames_in_ms(burst_ms + 15.0, rate)) << "pulse inside a ripple";
        EXPECT_LE(into_second, frames_in_ms(burst_ms + 80.0, rate));
    }
}

TEST(Conditions, DelayedPulseThatMayNotWaitLongEnoughIsOmittedByName) {
    auto settings = settings_for(Condition::delayed);
    settings.arbiter.delay = {30.0, 30.0, true};
    settings.arbiter.hold = {20.0, 10.0, true};
    const auto kept = run(settings, bursts(30));
    EXPECT_TRUE(kept.orders.empty());
    const auto omitted = kept.of(EventKind::omitted);
    ASSERT_EQ(omitted.size(), 25U);
    for (const auto& event : omitted) {
        EXPECT_EQ(static_cast<Rule>(event.code), Rule::held);
    }
}

TEST(Conditions, NoDelayedPulseOnceDisarmedOrFaulted) {
    for (const auto state : {ArmState::not_armed, ArmState::faulted}) {
        Kept kept;
        const auto settings = settings_for(Condition::delayed);
        Engine engine(Detector::make(settings.detector, ripple_channels(2), rate), settings.arbiter, {}, rate, kept,
                      kept);
        engine.start(SampleIndex{0}, true);
        const auto data = bursts(8);
        feed(engine, data, 0, 5 * 1250 + 100); // after the first trigger, before its pulse
        ASSERT_EQ(kept.of(EventKind::trigger).size(), 1U);
        engine.set_state(state, StateCause::command);
        feed(engine, data, 5 * 1250 + 100, 8 * 1250);
        EXPECT_TRUE(kept.orders.empty());
        const auto omitted = kept.of(EventKind::omitted);
        ASSERT_EQ(omitted.size(), 1U);
        EXPECT_EQ(static_cast<Rule>(omitted[0].code), state == ArmState::faulted ? Rule::faulted : Rule::not_armed);
    }
}

TEST(Conditions, CatchTrialsGetNoPulseWhereTheConditionGivesOne) {
    for (const auto condition : {Condition::disrupt, Condition::delayed}) {
        auto settings = settings_for(condition);
        settings.arbiter.catch_share = 0.4;
        const auto kept = run(settings, bursts(60));
        std::size_t caught = 0;
        for (const auto& trigger : kept.of(EventKind::trigger)) {
            const auto detail = trigger.as<TriggerDetail>();
            caught += detail.caught;
            const bool ordered = std::any_of(kept.orders.begin(), kept.orders.end(), [&](const Event& order) {
                return order.as<TriggerDetail>().number == detail.number;
            });
            EXPECT_EQ(ordered, detail.caught == 0);
        }
        EXPECT_GT(caught, 10U);
        EXPECT_LT(caught, 40U);
    }
}

TEST(Conditions, YokedPulsesFallAtTheirPlacesRippleOrNot) {
    auto settings = settings_for(Condition::yoked);
    settings.arbiter.hold.schedule = false;
    settings.arbiter.delay.in_every_condition = false;
    // The first before the floor is settled; the third within a burst; the fifth in a gap.
    Kept kept;
    Engine engine(Detector::make(settings.detector, ripple_channels(2), rate), settings.arbiter,
                  {{1000}, {7000}, {10 * 1250 + 60}, {13000}, {15005}, {16000}}, rate, kept, kept);
    engine.start(SampleIndex{0}, true);
    const auto data = bursts(20);
    feed(engine, data, 0, 15000);
    feed(engine, data, 15010, 20 * 1250);
    EXPECT_EQ(kept.places(EventKind::order), (std::vector<std::uint64_t>{7000, 10 * 1250 + 60, 13000, 16000}));
    const auto omitted = kept.of(EventKind::omitted);
    ASSERT_EQ(omitted.size(), 2U);
    EXPECT_EQ(static_cast<Rule>(omitted[0].code), Rule::unsettled);
    EXPECT_EQ(static_cast<Rule>(omitted[1].code), Rule::gap);
    EXPECT_GT(kept.of(EventKind::trigger).size(), 10U) << "detections are triggers as in every condition";
}

TEST(Conditions, RateMatchedPulsesWaitUntilNoRippleIsGoingOn) {
    const auto settings = settings_for(Condition::rate_matched);
    const std::uint64_t inside = 10 * 1250 + 60, quiet = 12 * 1250 + 700;
    const auto kept = run(settings, bursts(20), {SampleIndex{inside}, SampleIndex{quiet}});
    ASSERT_EQ(kept.orders.size(), 2U);
    EXPECT_GT(kept.orders[0].sample.value, 10 * 1250 + frames_in_ms(burst_ms + 15.0, rate));
    EXPECT_EQ(kept.orders[0].as<TriggerDetail>().from, inside);
    EXPECT_EQ(kept.orders[1].sample.value, quiet);
}

TEST(Conditions, DecisionsDoNotDependOnPacketSize) {
    const auto data = bursts(40);
    for (const auto condition : all_conditions) {
        auto settings = settings_for(condition);
        settings.arbiter.delay.least_ms = 30.0; // many are held
        const auto expected = run(settings, data, some_places, 1).events;
        for (const std::size_t block : {7U, 64U, 1000U}) {
            EXPECT_EQ(run(settings, data, some_places, block).events, expected) << block;
        }
    }
}

} // namespace
} // namespace millpond
