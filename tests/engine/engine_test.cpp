#include "engine/engine.hpp"
#include "support/kept_decisions.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <limits>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};

using Kept = test::KeptDecisions;
using test::quick_settings;

Engine engine_of(const EngineSettings& settings, std::size_t channels, Kept& kept,
                 std::vector<SampleIndex> schedule = {}) {
    return {Detector::make(settings.detector, ripple_channels(channels), rate),
            settings.arbiter,
            std::move(schedule),
            rate,
            kept,
            kept};
}

/// A burst a second from 5 s on, on two channels.
std::vector<float> bursts(std::size_t seconds = 30) {
    auto data = test::white_noise(seconds * 1250, 2, 20.0, 7);
    for (std::size_t second = 5; second < seconds; ++second) {
        test::add_burst(data, 2, second * 1250, 100, rate.value, 200.0, 250.0);
    }
    return data;
}

void feed(Engine& engine, const std::vector<float>& data, std::size_t from, std::size_t to, std::size_t block) {
    const FrameBlock whole = test::block_of(data, 2);
    for (std::size_t at = from; at < to; at += block) {
        engine.process(whole.part(at, std::min(block, to - at)));
    }
}

TEST(Engine, GivesTheSameEventsAtPacketSizes1And7And64And1000) {
    auto data = bursts();
    data[2 * 9000] = std::numeric_limits<float>::quiet_NaN();
    data[2 * 9003 + 1] = std::numeric_limits<float>::infinity();
    // A long stretch across many blocks, over a place where floors are due; and one at the very end.
    std::fill_n(data.begin() + 2 * 11240, 2 * 40, std::numeric_limits<float>::quiet_NaN());
    std::fill_n(data.end() - 2 * 77, 2 * 77, std::numeric_limits<float>::quiet_NaN());
    const auto events_at = [&](std::size_t block) {
        Kept kept;
        auto settings = quick_settings();
        settings.arbiter.gates = {{"g", true}};
        auto engine = engine_of(settings, 2, kept);
        engine.start(SampleIndex{0}, true);
        feed(engine, data, 0, 12345, block);
        engine.set_gate("g", false);
        feed(engine, data, 12345, 15001, block);
        engine.set_gate("g", true);
        feed(engine, data, 16000, 30 * 1250, block); // 999 frames lost
        engine.finish();
        return kept.events;
    };
    const auto expected = events_at(1);
    EXPECT_GT(expected.size(), 60U);
    for (const std::size_t block : {7U, 64U, 1000U}) {
        EXPECT_EQ(events_at(block), expected) << block;
    }
}

TEST(Engine, EveryDetectionIsFollowedByItsTriggerOrByOneRefusal) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    engine.start(SampleIndex{0}, true);
    feed(engine, bursts(), 0, 30 * 1250, 64);
    for (std::size_t i = 0; i < kept.events.size(); ++i) {
        if (kept.events[i].kind == EventKind::detection) {
            const auto& next = kept.events.at(i + 1);
            EXPECT_TRUE(next.kind == EventKind::trigger || next.kind == EventKind::withheld);
            EXPECT_EQ(next.sample, kept.events[i].sample);
        }
    }
    EXPECT_EQ(kept.of(EventKind::trigger).size(), kept.pulses.size());
    EXPECT_EQ(kept.pulses.size(), 25U);
}

TEST(Engine, NotArmedItDetectsAndNeverPulses) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    engine.start(SampleIndex{0}, false);
    feed(engine, bursts(), 0, 30 * 1250, 64);
    EXPECT_TRUE(kept.pulses.empty());
    const auto withheld = kept.of(EventKind::withheld);
    ASSERT_GE(withheld.size(), 25U);
    for (const auto& event : withheld) {
        EXPECT_EQ(event.code, static_cast<std::uint8_t>(Rule::not_armed));
    }
}

TEST(Engine, LostFramesBecomeAGapAndTriggersAreWithheldUntilSettled) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    engine.start(SampleIndex{0}, true);
    const auto data = bursts();
    feed(engine, data, 0, 10 * 1250 - 20, 10);
    feed(engine, data, 10 * 1250, 12 * 1250, 10); // the burst at 10 s follows the gap at once
    const auto gaps = kept.of(EventKind::gap);
    ASSERT_EQ(gaps.size(), 1U);
    EXPECT_EQ(gaps[0].sample, SampleIndex{10 * 1250 - 20});
    EXPECT_EQ(gaps[0].as<GapDetail>().frames, 20U);
    const auto withheld = kept.of(EventKind::withheld);
    ASSERT_EQ(withheld.size(), 1U);
    EXPECT_EQ(withheld[0].code, static_cast<std::uint8_t>(Rule::gap));
    EXPECT_EQ(kept.pulses.back() / 1250, 11U);
}

TEST(Engine, NonFiniteFramesCountAsOneGap) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    engine.start(SampleIndex{0}, true);
    auto data = bursts();
    for (std::size_t i = 9000; i < 9010; ++i) {
        data[2 * i + i % 2] = std::numeric_limits<float>::quiet_NaN();
    }
    feed(engine, data, 0, 10 * 1250, 1250);
    const auto gaps = kept.of(EventKind::gap);
    ASSERT_EQ(gaps.size(), 1U);
    EXPECT_EQ(gaps[0].code, static_cast<std::uint8_t>(GapCause::non_finite));
    EXPECT_EQ(gaps[0].as<GapDetail>().frames, 10U);
}

TEST(Engine, FloorsAreJournaledOnceASecondOfTheStream) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    engine.start(SampleIndex{0}, true);
    feed(engine, bursts(), 0, 10 * 1250, 64);
    const auto floors = kept.of(EventKind::floor);
    ASSERT_EQ(floors.size(), 10U * 3U); // two sites and their mean
    EXPECT_EQ(floors[3].sample, SampleIndex{2 * 1250});
}

TEST(Engine, LongNotesContinueInFurtherEvents) {
    Kept kept;
    auto engine = engine_of(quick_settings(), 2, kept);
    const std::string text(100, 'x');
    engine.note(text);
    const auto notes = kept.of(EventKind::note);
    ASSERT_EQ(notes.size(), 3U);
    EXPECT_EQ(notes[0].as<NoteDetail>().continues, 1);
    EXPECT_EQ(notes[2].as<NoteDetail>().continues, 0);
    EXPECT_EQ(notes[2].as<NoteDetail>().length, 100 - 2 * 38);
}

} // namespace
} // namespace millpond
