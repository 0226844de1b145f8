// Limits, guards and the session's plan, through the whole engine.
#include "engine/engine.hpp"
#include "support/kept_decisions.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <limits>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};
constexpr std::size_t second = 1250;

struct Kept : test::KeptDecisions {
    [[nodiscard]] std::size_t withheld(Rule rule) const {
        const auto all = of(EventKind::withheld);
        return static_cast<std::size_t>(std::count_if(all.begin(), all.end(), [rule](const auto& event) {
            return event.code == static_cast<std::uint8_t>(rule);
        }));
    }
    [[nodiscard]] std::vector<std::string> states() const {
        std::vector<std::string> words;
        for (const auto& event : of(EventKind::state)) {
            words.push_back(std::string(name_of(static_cast<ArmState>(event.code))) + ", " +
                            std::string(name_of(static_cast<StateCause>(event.as<StateDetail>().cause))) + ", " +
                            std::string(name_of(by_of(event.as<StateDetail>()).source)));
        }
        return words;
    }
};

using test::quick_settings;

Engine engine_of(const EngineSettings& settings, Kept& kept) {
    return {Detector::make(settings.detector, ripple_channels(2), rate), settings.arbiter, {}, rate, kept, kept};
}

/// 80 ms bursts on two channels, from 5 s on, every `apart` frames and `jitter` more each other time.
std::vector<float> bursts(std::size_t seconds, std::size_t apart = second, std::size_t jitter = 0) {
    auto data = test::white_noise(seconds * second, 2, 20.0, 7);
    bool late = false;
    for (std::size_t at = 5 * second; at + 100 < seconds * second; at += apart) {
        test::add_burst(data, 2, at + (late ? jitter : 0), 100, rate.value, 200.0, 250.0);
        late = !late;
    }
    return data;
}

void feed(Engine& engine, const std::vector<float>& data, std::size_t from, std::size_t to, std::size_t block = 64) {
    const FrameBlock whole = test::block_of(data, 2);
    for (std::size_t at = from; at < to; at += block) {
        engine.process(whole.part(at, std::min(block, to - at)));
    }
}

Kept ran(const EngineSettings& settings, const std::vector<float>& data, std::size_t block = 64) {
    Kept kept;
    auto engine = engine_of(settings, kept);
    engine.start(SampleIndex{0}, true);
    feed(engine, data, 0, data.size() / 2, block);
    engine.finish();
    return kept;
}

const std::vector<std::string> just_armed{"armed, start, settings"};

TEST(EngineLimits, EachOfThemWithholdsWhatIsTooMuchByItsOwnRule) {
    const auto data = bursts(30, 450); // every 360 ms
    const auto check = [&](Rule rule, auto set) {
        auto settings = quick_settings();
        settings.arbiter.limits.runaway.on = false;
        set(settings.arbiter.limits);
        const auto kept = ran(settings, data);
        EXPECT_GT(kept.withheld(rule), 5U) << name_of(rule);
        EXPECT_GT(kept.pulses.size(), 0U) << name_of(rule);
        return kept;
    };
    check(Rule::second_limit, [](LimitsSettings& limits) { limits.max_pulses_per_second = 1; });
    const auto minute = check(Rule::minute_limit, [](LimitsSettings& limits) { limits.max_pulses_per_minute = 5; });
    EXPECT_EQ(minute.pulses.size(), 5U);
    const auto epoch = check(Rule::epoch_limit, [](LimitsSettings& limits) { limits.max_pulses_per_epoch = 6; });
    EXPECT_EQ(epoch.pulses.size(), 6U);
    const auto session = check(Rule::session_limit, [](LimitsSettings& limits) { limits.max_pulses_per_session = 7; });
    EXPECT_EQ(session.pulses.size(), 7U);
    const auto interval = check(Rule::interval, [](LimitsSettings& limits) { limits.min_interval_ms = 700.0; });
    for (std::size_t i = 1; i < interval.pulses.size(); ++i) {
        EXPECT_GE(interval.pulses[i] - interval.pulses[i - 1], 700U * second / 1000U);
    }
}

// The rule that keeps conditions matched: what is counted is triggers, not pulses.
TEST(EngineLimits, CountTriggersAlikeInEveryCondition) {
    const auto data = bursts(30, 450);
    const auto triggers_in = [&](Condition condition) {
        auto settings = quick_settings();
        settings.arbiter.limits.max_pulses_per_second = 2;
        settings.arbiter.limits.max_pulses_per_minute = 20;
        settings.arbiter.condition = condition;
        std::vector<std::uint64_t> places;
        for (const auto& trigger : ran(settings, data).of(EventKind::trigger)) {
            places.push_back(trigger.sample.value);
        }
        return places;
    };
    const auto disrupting = triggers_in(Condition::disrupt);
    EXPECT_EQ(disrupting.size(), 20U);
    EXPECT_EQ(triggers_in(Condition::none), disrupting);
}

TEST(EngineLimits, TriggersAtAFixedIntervalFaultTheSession) {
    auto settings = quick_settings();
    settings.arbiter.limits.runaway.equal_intervals = 8;
    settings.arbiter.limits.runaway.equal_within_ms = 20.0;
    const auto kept = ran(settings, bursts(20, 375)); // every 300 ms
    EXPECT_EQ(kept.states(), (std::vector<std::string>{"armed, start, settings", "faulted, runaway, program"}));
    EXPECT_EQ(kept.pulses.size(), 9U) << "eight intervals";
    EXPECT_GT(kept.withheld(Rule::faulted), 10U);
    const auto fault = kept.of(EventKind::state).back();
    EXPECT_EQ(fault.sample.value, kept.pulses.back() + 1) << "at the very next frame";
}

TEST(EngineLimits, FarMoreTriggersThanExpectedFaultTheSessionHoweverIrregular) {
    auto settings = quick_settings();
    settings.arbiter.limits.runaway.equal_below_ms = 0.0; // so that only the rate can tell
    settings.arbiter.limits.runaway.window_s = 5.0;
    settings.arbiter.limits.runaway.expected_per_s = 0.5;
    settings.arbiter.limits.runaway.false_alarms_per_hour = 1e-3;
    const auto bound = runaway_bound(0.5, 5.0, 1e-3);
    const auto kept = ran(settings, bursts(20, 375, 50));
    EXPECT_EQ(kept.states().back(), "faulted, runaway, program");
    EXPECT_EQ(kept.pulses.size(), bound);
    settings.arbiter.limits.runaway.expected_per_s = 3.0;
    EXPECT_EQ(ran(settings, bursts(20, 375, 50)).states(), just_armed);
}

TEST(EngineLimits, ALimitDoesNotHideARunaway) {
    auto settings = quick_settings();
    settings.arbiter.limits.max_pulses_per_second = 1;
    settings.arbiter.limits.runaway.window_s = 5.0;
    settings.arbiter.limits.runaway.expected_per_s = 0.5;
    settings.arbiter.limits.runaway.false_alarms_per_hour = 1e-3;
    const auto kept = ran(settings, bursts(20, 375, 50));
    EXPECT_EQ(kept.states().back(), "faulted, runaway, program");
    EXPECT_LT(kept.pulses.size(), 6U);
}

TEST(EngineLimits, TooManyGapsFaultTheSessionWhereTheLastOfThemEnds) {
    auto settings = quick_settings();
    settings.arbiter.limits.max_gaps_per_minute = 3;
    Kept kept;
    auto engine = engine_of(settings, kept);
    engine.start(SampleIndex{0}, true);
    const auto data = bursts(20);
    for (std::size_t s = 0; s < 19; ++s) { // ten frames lost within each second from the sixth on
        feed(engine, data, s * second, s * second + 600);
        feed(engine, data, s * second + (s >= 6 ? 610 : 600), (s + 1) * second);
    }
    EXPECT_EQ(kept.states().back(), "faulted, too many gaps, program");
    EXPECT_EQ(kept.of(EventKind::state).back().sample, SampleIndex{9 * second + 610}) << "the fourth gap ends there";
    EXPECT_GT(kept.withheld(Rule::faulted), 3U);
}

TEST(EngineLimits, TooLargeAShareLostFaultsTheSession) {
    auto settings = quick_settings();
    settings.arbiter.limits.max_lost_percent = 5.0;
    auto data = bursts(20);
    std::fill_n(data.begin() + 2 * 8 * second, 2 * 3 * second, std::numeric_limits<float>::quiet_NaN());
    EXPECT_EQ(ran(settings, data).states(), just_armed) << "3 s are 5 % of a minute";
    data[2 * 11 * second] = std::numeric_limits<float>::quiet_NaN();
    EXPECT_EQ(ran(settings, data).states().back(), "faulted, too many gaps, program");
}

TEST(EngineLimits, AFloorOutOfItsRangeFaultsTheSession) {
    auto data = bursts(60);
    for (std::size_t i = 2 * 20 * second; i < data.size(); ++i) {
        data[i] *= 3.0F; // the amplifier's gain was changed
    }
    auto settings = quick_settings();
    settings.arbiter.limits.floor.most_times = 2.0;
    const auto by_times = ran(settings, data);
    EXPECT_EQ(by_times.states().back(), "faulted, floor out of range, program");
    EXPECT_GT(by_times.of(EventKind::state).back().sample.value, 20 * second);
    EXPECT_EQ(by_times.of(EventKind::state).back().sample.value % second, 0U) << "floors are looked at once a second";
    settings.arbiter.limits.floor.most_times = 50.0;
    EXPECT_EQ(ran(settings, data).states(), just_armed);
    settings.arbiter.limits.floor.most_uv = 4.0; // 20 uV of white noise at first, then 60
    EXPECT_EQ(ran(settings, data).states().back(), "faulted, floor out of range, program");
}

TEST(EngineLimits, FaultNothingThatIsNotArmedAndArmingBeginsAnew) {
    auto settings = quick_settings();
    settings.arbiter.limits.max_gaps_per_minute = 1;
    Kept kept;
    auto engine = engine_of(settings, kept);
    engine.start(SampleIndex{0}, false);
    const auto data = bursts(20);
    const auto lose = [&](std::size_t s) { feed(engine, data, s * second, (s + 1) * second - 10); };
    lose(6), lose(7), lose(8);
    engine.set_state(ArmState::armed, StateCause::command);
    lose(9); // ends the gap of before: one
    EXPECT_EQ(engine.arbiter().state(), ArmState::armed);
    lose(10);
    EXPECT_EQ(engine.arbiter().state(), ArmState::faulted);
}

PlanSettings three_epochs(bool ends_session = false) {
    return {{{"rest 1", 10.0 / 60.0, false}, {"track", 8.0 / 60.0, true}, {"rest 2", 0.0, true}}, ends_session};
}

TEST(EnginePlan, PulsesComeInEpochsThatAllowThemAlone) {
    auto settings = quick_settings();
    settings.arbiter.plan = three_epochs();
    settings.arbiter.plan.epochs[2] = {"rest 2", 5.0 / 60.0, false};
    const auto kept = ran(settings, bursts(30));
    ASSERT_FALSE(kept.pulses.empty());
    for (const auto pulse : kept.pulses) {
        EXPECT_GE(pulse, 10 * second);
        EXPECT_LT(pulse, 18 * second);
    }
    EXPECT_EQ(kept.pulses.size(), 8U);
    EXPECT_EQ(kept.withheld(Rule::gate), 17U) << "a burst a second from the fifth on: five before, twelve after";
    const auto epochs = kept.of(EventKind::epoch);
    ASSERT_EQ(epochs.size(), 4U);
    const std::uint64_t starts[] = {0, 10 * second, 18 * second, 23 * second};
    const char* names[] = {"rest 1", "track", "rest 2", "after the plan"};
    for (std::size_t i = 0; i < 4; ++i) {
        EXPECT_EQ(epochs[i].sample, SampleIndex{starts[i]});
        EXPECT_STREQ(epochs[i].as<EpochDetail>().name.data(), names[i]);
        EXPECT_EQ(epochs[i].as<EpochDetail>().index, i);
    }
}

TEST(EnginePlan, EachEpochHasItsOwnCount) {
    auto settings = quick_settings();
    settings.arbiter.plan.epochs = {{"a", 10.0 / 60.0, true}, {"b", 10.0 / 60.0, true}};
    settings.arbiter.limits.max_pulses_per_epoch = 3;
    const auto kept = ran(settings, bursts(20));
    EXPECT_EQ(kept.pulses.size(), 6U);
    EXPECT_GT(kept.pulses[3], 10 * second);
    EXPECT_EQ(kept.withheld(Rule::epoch_limit), 9U);
}

TEST(EnginePlan, AnEpochThatBeginsInAGapBeginsAtItsOwnPlace) {
    auto settings = quick_settings();
    settings.arbiter.plan = three_epochs();
    Kept kept;
    auto engine = engine_of(settings, kept);
    engine.start(SampleIndex{0}, true);
    const auto data = bursts(20);
    feed(engine, data, 0, 9 * second);
    feed(engine, data, 11 * second, 20 * second);
    EXPECT_EQ(kept.of(EventKind::epoch).at(1).sample, SampleIndex{10 * second});
    EXPECT_EQ(kept.of(EventKind::epoch).at(2).sample, SampleIndex{18 * second});
}

TEST(EnginePlan, IsToldToGoOnAndSaysByWhom) {
    auto settings = quick_settings();
    settings.arbiter.plan.epochs = {{"a", 0.0, false}, {"b", 0.0, true}};
    Kept kept;
    auto engine = engine_of(settings, kept);
    engine.start(SampleIndex{0}, true);
    const auto data = bursts(20);
    feed(engine, data, 0, 10 * second);
    engine.next_epoch({ChangeSource::command, 4711, 0x7F000001});
    feed(engine, data, 10 * second, 15 * second);
    engine.next_epoch({ChangeSource::command});
    EXPECT_TRUE(engine.arbiter().plan().over());
    engine.next_epoch({ChangeSource::command}); // nothing follows
    const auto epochs = kept.of(EventKind::epoch);
    ASSERT_EQ(epochs.size(), 3U);
    EXPECT_EQ(epochs[1].sample, SampleIndex{10 * second});
    EXPECT_EQ(by_of(epochs[1].as<EpochDetail>()).port, 4711);
    EXPECT_EQ(by_of(epochs[1].as<EpochDetail>()).address, 0x7F000001U);
    EXPECT_EQ(kept.pulses.size(), 5U);
}

// With every limit, guard and epoch at work, gaps and a command among them.
TEST(EngineLimits, GiveTheSameEventsAtPacketSizes1And7And64And1000) {
    auto data = bursts(40, 450, 31);
    std::fill_n(data.begin() + 2 * 9 * second + 77, 2 * 40, std::numeric_limits<float>::quiet_NaN());
    for (std::size_t i = 2 * 33 * second; i < data.size(); ++i) {
        data[i] *= 4.0F;
    }
    auto settings = quick_settings();
    settings.arbiter.limits.max_pulses_per_second = 2;
    settings.arbiter.limits.max_pulses_per_epoch = 6;
    settings.arbiter.limits.max_gaps_per_minute = 1;
    settings.arbiter.limits.floor.most_times = 3.0;
    settings.arbiter.limits.runaway.expected_per_s = 0.2;
    settings.arbiter.limits.runaway.window_s = 5.0;
    settings.arbiter.limits.runaway.false_alarms_per_hour = 1e-3;
    settings.arbiter.plan.epochs = {
        {"a", 10.0037 / 60.0, true}, {"b", 3.0011 / 60.0, false}, {"c", 0.0, true}, {"d", 20.0 / 60.0, true}};
    const auto events_at = [&](std::size_t block) {
        Kept kept;
        auto engine = engine_of(settings, kept);
        engine.start(SampleIndex{0}, true);
        feed(engine, data, 0, 11'125, block);
        engine.set_state(ArmState::armed, StateCause::command);
        feed(engine, data, 11'125, 12'345, block);
        feed(engine, data, 12'355, 18'001, block); // ten frames lost
        engine.set_state(ArmState::armed, StateCause::command);
        engine.next_epoch({ChangeSource::command});
        feed(engine, data, 18'001, 30'001, block);
        engine.set_state(ArmState::armed, StateCause::command);
        feed(engine, data, 30'001, 40'001, block);
        engine.set_state(ArmState::armed, StateCause::command);
        feed(engine, data, 40'001, 40 * second, block);
        engine.finish();
        return kept;
    };
    const auto expected = events_at(1);
    const auto states = expected.states();
    for (const auto* cause :
         {"faulted, runaway, program", "faulted, too many gaps, program", "faulted, floor out of range, program"}) {
        EXPECT_GE(std::count(states.begin(), states.end(), cause), 1)
            << cause << " among " << ::testing::PrintToString(states);
    }
    EXPECT_EQ(expected.of(EventKind::epoch).size(), 5U) << "four, and what comes after";
    for (const std::size_t block : {7U, 64U, 1000U}) {
        EXPECT_EQ(events_at(block).events, expected.events) << block;
    }
}

} // namespace
} // namespace millpond
