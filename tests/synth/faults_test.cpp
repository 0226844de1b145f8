#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::live_through;

SceneSettings four_sites() {
    SceneSettings settings;
    settings.duration_s = 40.0;
    settings.reference = true;
    return settings;
}

/// Values of one channel of five, from a time on.
std::vector<float> channel(const std::vector<float>& frames, std::size_t index, double from_s = 0.0) {
    std::vector<float> values;
    for (auto i = static_cast<std::size_t>(from_s * 1250.0); i < frames.size() / 5; ++i) {
        values.push_back(frames[5 * i + index]);
    }
    return values;
}

double rms(const std::vector<float>& values) {
    double squares = 0.0;
    for (const float value : values) {
        squares += static_cast<double>(value) * value;
    }
    return std::sqrt(squares / static_cast<double>(values.size()));
}

TEST(Faults, DeadSiteIsFlatRailedOrHugeFromTheStartAndTheOthersStayAsTheyWere) {
    const auto healthy = live_through(four_sites()).frames;
    for (const auto kind : {FaultKind::flat, FaultKind::railed, FaultKind::huge}) {
        auto settings = four_sites();
        settings.faults.dead_site = 2;
        settings.faults.dead_kind = kind;
        const auto lived = live_through(settings);
        const auto dead = channel(lived.frames, 1);
        if (kind == FaultKind::huge) {
            EXPECT_NEAR(rms(dead), 1500.0, 30.0);
        } else {
            const float value = kind == FaultKind::flat ? 0.0f : 5000.0f;
            EXPECT_TRUE(std::all_of(dead.begin(), dead.end(), [value](float each) { return each == value; }));
        }
        for (const std::size_t other : {0u, 2u, 3u, 4u}) {
            EXPECT_EQ(channel(lived.frames, other), channel(healthy, other));
        }
        ASSERT_EQ(lived.of(HappeningKind::dead).size(), 1u);
        EXPECT_EQ(lived.of(HappeningKind::dead)[0].onset_s, 0.0);
    }
}

TEST(Faults, FailingSiteIsWellUntilItsTime) {
    const auto healthy = live_through(four_sites()).frames;
    auto settings = four_sites();
    settings.faults.failing_site = 4;
    settings.faults.failing_kind = FaultKind::railed;
    settings.faults.failing_at_s = 25.0;
    const auto lived = live_through(settings);
    const auto from = 5 * 25 * 1250;
    EXPECT_TRUE(std::equal(healthy.begin(), healthy.begin() + from, lived.frames.begin()));
    for (const float value : channel(lived.frames, 3, 25.0)) {
        ASSERT_EQ(value, 5000.0f);
    }
    ASSERT_EQ(lived.of(HappeningKind::dead).size(), 1u);
    EXPECT_EQ(lived.of(HappeningKind::dead)[0].onset_s, 25.0);
}

TEST(GainDrift, ScalesEachChannelSlowlyAndOnItsOwn) {
    auto settings = four_sites();
    settings.duration_s = 600.0;
    const auto steady = live_through(settings).frames;
    settings.gain_drift.log_sd = 0.2;
    settings.gain_drift.period_s = 100.0;
    const auto drifting = live_through(settings).frames;
    std::vector<std::vector<double>> logs(5); // of the gain, each second
    for (std::size_t second = 0; second < 600; ++second) {
        for (std::size_t i = 0; i < 5; ++i) {
            const auto at = second * 1250 * 5 + i;
            logs[i].push_back(std::log(static_cast<double>(drifting[at]) / steady[at]));
        }
    }
    for (std::size_t i = 0; i < 5; ++i) {
        double squares = 0.0, change = 0.0;
        for (std::size_t second = 0; second < 600; ++second) {
            squares += logs[i][second] * logs[i][second] / 600.0;
            change = second == 0 ? 0.0 : std::max(change, std::abs(logs[i][second] - logs[i][second - 1]));
        }
        EXPECT_NEAR(std::sqrt(squares), 0.2, 0.04);
        EXPECT_LT(change, 0.06);
        EXPECT_NE(logs[i], logs[(i + 1) % 5]);
    }
}

} // namespace
} // namespace millpond
