// Muscle and steps beyond what is the same on all channels.
#include "support/python.hpp"
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::live_through;
using test::silent;

SceneSettings muscle(double rate_hz = 1250.0) {
    auto settings = silent(2, true);
    settings.rate_hz = rate_hz;
    settings.duration_s = 300.0;
    settings.artefacts.muscle_per_min = 30.0;
    return settings;
}

class MuscleInSciPy : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
};

TEST_F(MuscleInSciPy, IsBroadAndTheSameAtAnyRate) {
    std::vector<std::vector<double>> shares;
    for (const double rate_hz : {1250.0, 10'000.0}) {
        auto settings = muscle(rate_hz);
        settings.duration_s = 60.0;
        shares.push_back(
            test::ask_scipy("f, p = signal.welch(x[:,0], float(sys.argv[2]), nperseg=int(float(sys.argv[2]) / 2))\n"
                            "for low, high in (10, 40), (100, 140), (150, 250), (320, 560):\n"
                            "    print(p[(f >= low) & (f < high)].mean() / p[(f >= 100) & (f < 300)].mean())",
                            live_through(settings).frames, 3, std::to_string(rate_hz)));
        ASSERT_EQ(shares.back().size(), 4u);
        EXPECT_LT(shares.back()[0], 0.4) << "little below 60 Hz";
        EXPECT_NEAR(shares.back()[1], 1.0, 0.3) << "as much below the ripple band";
        EXPECT_NEAR(shares.back()[2], 1.0, 0.3) << "as within";
        EXPECT_GT(shares.back()[3], 0.2) << "and some above";
    }
    for (std::size_t k = 0; k < 4; ++k) {
        // Just below half of the slow rate more is left than of a true low-pass.
        EXPECT_NEAR(shares[0][k] / shares[1][k], k == 3 ? 1.5 : 1.0, 0.3) << k;
    }
}

TEST_F(MuscleInSciPy, IsLargerOnTheReferenceAndPartlyEachChannelsOwn) {
    auto settings = muscle();
    settings.artefacts.muscle_reference = 1.5;
    settings.artefacts.muscle_own = 0.2;
    const auto said =
        test::ask_scipy("s = x.std(0); c = np.corrcoef(x.T); print(s[2] / s[0], s[1] / s[0], c[0, 1], c[0, 2])",
                        live_through(settings).frames, 3);
    ASSERT_EQ(said.size(), 4u);
    EXPECT_NEAR(said[0], 1.5, 0.08);
    EXPECT_NEAR(said[1], 1.0, 0.05);
    EXPECT_NEAR(said[2], 0.8, 0.03);
    EXPECT_NEAR(said[3], 0.8, 0.03);
}

TEST(Muscle, ComesInGradedStrength) {
    auto settings = muscle();
    settings.artefacts.muscle_log_sd = 0.7;
    settings.duration_s = 1200.0;
    const auto lived = live_through(settings);
    double mean = 0.0, squares = 0.0, count = 0.0;
    for (const auto& burst : lived.of(HappeningKind::muscle)) {
        double power = 0.0;
        for (auto i = static_cast<std::size_t>(burst.onset_s * 1250.0);
             i < static_cast<std::size_t>(burst.end_s * 1250.0); ++i) {
            power += static_cast<double>(lived.frames[3 * i]) * lived.frames[3 * i];
        }
        mean += 0.5 * std::log(power);
        squares += 0.25 * std::log(power) * std::log(power);
        count += 1.0;
    }
    ASSERT_GE(count, 300.0);
    EXPECT_NEAR(std::sqrt(squares / count - mean * mean / count / count), 0.7, 0.1);
}

TEST(Muscle, InChewingComesAgainAndAgain) {
    auto settings = muscle();
    settings.duration_s = 1200.0;
    settings.artefacts.muscle_per_min = 5.0;
    settings.artefacts.muscle_ms = 120.0;
    settings.artefacts.chewing_share = 0.75;
    const auto bursts = live_through(settings).of(HappeningKind::muscle);
    double again = 0.0;
    for (std::size_t i = 1; i < bursts.size(); ++i) {
        again += std::abs(bursts[i].onset_s - bursts[i - 1].onset_s - 0.2) < 1e-6 ? 1.0 : 0.0;
    }
    ASSERT_GE(bursts.size(), 200u);
    EXPECT_NEAR(again / static_cast<double>(bursts.size()), 0.75, 0.1);
}

TEST(Muscle, IsWhereTheTruthSaysAndNowhereElse) {
    const auto lived = live_through(muscle());
    for (const auto& burst : lived.of(HappeningKind::muscle)) {
        EXPECT_NEAR(burst.end_s - burst.onset_s, 0.3, 1e-9);
    }
    std::size_t within = 0;
    for (std::size_t i = 0; i < lived.frames.size() / 3; ++i) {
        const double t = static_cast<double>(i) / 1250.0;
        const bool said = std::any_of(lived.happenings.begin(), lived.happenings.end(),
                                      [t](const auto& burst) { return t > burst.onset_s && t < burst.end_s; });
        ASSERT_EQ(lived.frames[3 * i] != 0.0f, said) << t;
        within += said ? 1 : 0;
    }
    EXPECT_GT(within, 10'000u);
}

TEST(Steps, OfOneChannelLeaveTheOthersAlone) {
    auto settings = silent(3, true);
    settings.duration_s = 120.0;
    settings.artefacts.site_steps_per_min = 20.0;
    const auto lived = live_through(settings);
    std::vector<int> jumps(4);
    for (std::size_t i = 4; i < lived.frames.size(); ++i) {
        jumps[i % 4] += std::abs(lived.frames[i] - lived.frames[i - 4]) > 1500.0f ? 1 : 0;
    }
    int all = 0;
    for (const int each : jumps) {
        EXPECT_GT(each, 0);
        all += each;
    }
    EXPECT_EQ(static_cast<std::size_t>(all), lived.of(HappeningKind::step).size());
    EXPECT_NEAR(all, 40, 25);
}

} // namespace
} // namespace millpond
