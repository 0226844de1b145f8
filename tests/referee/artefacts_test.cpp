#include "referee/artefacts.hpp"
#include "referee/invented_signal.hpp"
#include "referee/referee.hpp"
#include "referee/referee_report.hpp"

#include <gtest/gtest.h>

#include <limits>

namespace millpond {
namespace {

using test::Signal;

constexpr float missing = std::numeric_limits<float>::quiet_NaN();

// 30 s, two sites and a reference; a ripple at 10 s on the sites, and at 20 s.
struct Scene {
    Signal signal{Hertz{1250.0}, 3, 30.0};
    Channels channels = ripple_channels(3);
    RefereeSettings settings;

    Scene() {
        signal.add_noise(10.0);
        channels[2].role = ChannelRole::reference;
        settings.peak_deviations = 8.0;
        for (const double at : {10.0, 20.0}) {
            add_ripple(at, 0, 2);
        }
    }

    void add_ripple(double at, std::size_t from, std::size_t to, double amplitude = 150.0) {
        Signal one(signal.rate, 1, 30.0);
        one.add_ripple(at, amplitude);
        for (std::size_t f = 0; f < one.data.size(); ++f) {
            for (std::size_t c = from; c < to; ++c) {
                signal.data[3 * f + c] += one.data[f];
            }
        }
    }

    void put(std::size_t channel, std::size_t from, std::size_t to, float value) {
        for (std::size_t f = from; f < to; ++f) {
            signal.data[3 * f + channel] = value;
        }
    }

    [[nodiscard]] RefereeFindings judge() const {
        return find_ripples(settings, channels, signal.rate, signal.block());
    }
};

TEST(Artefacts, OfACleanRecordingAreNone) {
    const auto found = Scene().judge();
    EXPECT_EQ(found.ripples.size(), 2U);
    EXPECT_TRUE(found.artefacts.excluded.empty());
    EXPECT_EQ(found.dropped_events, 0U);
    EXPECT_EQ(found.frames_judged, 37500U);
}

TEST(Artefacts, MissingSamplesTakeTheirPadAndTheRippleInIt) {
    Scene scene;
    scene.signal.data[3 * 12560 + 1] = missing; // 48 ms after the ripple's peak
    const auto found = scene.judge();
    ASSERT_EQ(found.artefacts.excluded.size(), 1U);
    EXPECT_EQ(found.artefacts.excluded[0], (Interval{SampleIndex{12560 - 125}, SampleIndex{12561 + 125}}));
    EXPECT_EQ(found.artefacts.missing, 1U);
    EXPECT_EQ(found.ripples.size(), 1U);
    EXPECT_EQ(found.dropped_events, 1U);
    EXPECT_EQ(found.frames_judged, 37500U - 251U);
}

TEST(Artefacts, FramesLeftOutBetweenBlocksAreMissing) {
    const Scene scene;
    auto referee = Referee::make(scene.settings, scene.channels, scene.signal.rate);
    const auto block = scene.signal.block();
    referee.add(block.part(0, 5000));
    referee.add(block.part(6000, block.frames() - 6000));
    const auto found = referee.finish();
    ASSERT_EQ(found.artefacts.excluded.size(), 1U);
    EXPECT_EQ(found.artefacts.excluded[0], (Interval{SampleIndex{4875}, SampleIndex{6125}}));
    EXPECT_EQ(found.ripples.size(), 2U);
}

TEST(Artefacts, AChannelThatKeepsOneValueIsFlatFromSoManyMillisecondsOn) {
    Scene scene;
    scene.put(2, 5000, 5012, 3.0F); // 12 frames; 10 ms are 12.5, rounded 13
    EXPECT_EQ(scene.judge().artefacts.flat, 0U);
    scene.put(2, 5000, 5013, 3.0F);
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.flat, 1U);
    EXPECT_EQ(found.artefacts.excluded[0], (Interval{SampleIndex{4875}, SampleIndex{5138}}));
    scene.settings.artefacts.flat_ms = 0.0;
    EXPECT_EQ(scene.judge().artefacts.flat, 0U);
}

TEST(Artefacts, AValueAtTheRailIsOneWhereTheRailIsKnown) {
    Scene scene;
    scene.put(0, 5000, 5002, -3276.8F);
    EXPECT_EQ(scene.judge().artefacts.railed, 0U);
    scene.settings.artefacts.rail_uv = 3276.0;
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.railed, 1U);
    EXPECT_TRUE(contains(found.artefacts.excluded, SampleIndex{5001}));
}

TEST(Artefacts, ARiseOnAllChannelsIsNoRippleAndOneOnTheSitesIs) {
    Scene scene;
    scene.add_ripple(15.0, 0, 3);
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.common, 1U);
    EXPECT_EQ(found.ripples.size(), 2U);
    EXPECT_EQ(found.dropped_events, 1U);
    EXPECT_TRUE(contains(found.artefacts.excluded, SampleIndex{18750}));
    scene.settings.artefacts.common_deviations = 0.0;
    EXPECT_EQ(scene.judge().ripples.size(), 3U);
}

TEST(Artefacts, WithoutAReferenceNoRiseIsTooCommon) {
    Scene scene;
    scene.channels[2].role = ChannelRole::ripple;
    scene.add_ripple(15.0, 0, 3);
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.common, 0U);
    EXPECT_EQ(found.ripples.size(), 3U);
    EXPECT_NE(artefacts_text(scene.settings, found, scene.channels, Hertz{1250.0}).find("no reference"),
              std::string::npos);
}

TEST(Artefacts, AreLookedForAtAllOnlyWhenAsked) {
    Scene scene;
    scene.add_ripple(15.0, 0, 3);
    scene.put(2, 5000, 5100, 3.0F);
    scene.settings.artefacts.exclude = false;
    const auto found = scene.judge();
    EXPECT_TRUE(found.artefacts.excluded.empty());
    EXPECT_EQ(found.ripples.size(), 3U);
}

TEST(Artefacts, OfAHugeKindMoveNoThreshold) {
    Scene scene;
    scene.settings.clip_deviations = 0.0; // nothing else protects mean and SD
    const auto clean = scene.judge();
    for (const double at : {5.0, 6.0, 7.0}) {
        scene.add_ripple(at, 0, 3, 20000.0);
    }
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.common, 3U);
    EXPECT_NEAR(found.spread / clean.spread, 1.0, 0.1);
    scene.settings.artefacts.exclude = false;
    EXPECT_GT(scene.judge().spread / clean.spread, 10.0);
}

TEST(Artefacts, AChannelThatIsDeadTakesNoTimeAndIsNamed) {
    Scene scene;
    scene.add_ripple(15.0, 0, 3);
    scene.put(1, 0, 37500, 0.0F);
    const auto found = scene.judge();
    EXPECT_EQ(found.artefacts.dead_channels, (std::vector<std::size_t>{1}));
    EXPECT_EQ(found.artefacts.flat, 0U);
    EXPECT_EQ(found.artefacts.common, 1U); // site 0 and the reference still tell
    EXPECT_EQ(found.ripples.size(), 2U);
    EXPECT_NE(artefacts_text(scene.settings, found, scene.channels, Hertz{1250.0}).find("role unused: ch1"),
              std::string::npos);
}

} // namespace
} // namespace millpond
