// Gamma, delta and hum: where their power lies and on which channels.
#include "support/python.hpp"
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::live_through;
using test::silent;

class RhythmsInSciPy : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
};

// Fast gamma at 90-140 Hz, apart from ripples at 140-220 Hz: Sullivan et al. 2011.
TEST_F(RhythmsInSciPy, GammaLiesBelowTheRippleBandAndNotOnTheReference) {
    auto settings = silent(3, true);
    settings.duration_s = 300.0;
    settings.site_spacing_um = 120.0;
    settings.gamma.rate_per_s = 1.0;
    settings.gamma.depth_um = 120.0;
    settings.gamma.reference_share = 0.0;
    const auto lived = live_through(settings);
    const auto said = test::ask_scipy("f, p = signal.welch(x[:,2], 1250, nperseg=1024)\n"
                                      "within = (f >= 80) & (f <= 150); above = (f >= 160) & (f <= 250)\n"
                                      "print(p[within].sum() / p.sum(), p[above].sum() / p.sum(),"
                                      " *(x[:,:3].std(0) / x[:,2].std()), abs(x[:,3]).max())",
                                      lived.frames, 4);
    ASSERT_EQ(said.size(), 6u);
    EXPECT_GT(said[0], 0.97);
    EXPECT_LT(said[1], 0.01);
    EXPECT_NEAR(said[2], std::exp(-2.0), 1e-4) << "two spreads from where it is largest";
    EXPECT_NEAR(said[3], std::exp(-0.5), 1e-4);
    EXPECT_EQ(said[5], 0.0);
}

TEST(Gamma, ComesAtItsRateInItsSizesAndTheTruthHoldsEachBurst) {
    auto settings = silent(1);
    settings.duration_s = 2000.0;
    settings.gamma.rate_per_s = 0.5;
    settings.gamma.depth_um = 0.0;
    settings.gamma.amplitude_log_sd = 0.3;
    const auto lived = live_through(settings);
    const auto bursts = lived.of(HappeningKind::gamma);
    // A burst waits for the last one's end: 0.5 / (1 + 0.5 x 0.09 s).
    EXPECT_NEAR(static_cast<double>(bursts.size()), 957.0, 4.0 * std::sqrt(957.0));
    std::vector<double> peaks(bursts.size());
    std::size_t next = 0;
    for (std::size_t i = 0; i < lived.frames.size(); ++i) {
        const double t = static_cast<double>(i) / 1250.0;
        while (next < bursts.size() && t >= bursts[next].end_s) {
            ++next;
        }
        if (next < bursts.size() && t >= bursts[next].onset_s) {
            peaks[next] = std::max(peaks[next], std::abs(static_cast<double>(lived.frames[i])));
        } else {
            ASSERT_EQ(lived.frames[i], 0.0f) << "nothing but what the truth holds";
        }
    }
    std::sort(peaks.begin(), peaks.end());
    // Samples lie up to a sixth of a turn beside the peak of a wave of 140 Hz.
    EXPECT_NEAR(peaks[peaks.size() / 2], 80.0, 6.0);
    EXPECT_NEAR(std::log(peaks[peaks.size() * 84 / 100] / peaks[peaks.size() / 2]), 0.3, 0.05);
}

// Slow waves at 1-4 Hz: common practice.
TEST_F(RhythmsInSciPy, DeltaLiesAtOneToFourHertzAndLeavesTheRippleBandAlone) {
    for (const double rate_hz : {1250.0, 2500.0}) {
        auto settings = silent(1, true);
        settings.duration_s = 200.0;
        settings.rate_hz = rate_hz;
        settings.delta.rms_uv = 150.0;
        settings.delta.reference_share = 0.5;
        const auto said = test::ask_scipy(
            "fs = float(sys.argv[2]); f, p = signal.welch(x[:,0], fs, nperseg=int(16 * fs))\n"
            "b = signal.sosfilt(signal.butter(4, (100, 250), 'band', fs=fs, output='sos'), x[:,0])[int(fs):]\n"
            "print(x[:,0].std(), p[(f >= 1) & (f <= 4)].sum() / p.sum(), f[np.argmax(p)], b.std(),"
            " x[:,1].std() / x[:,0].std())",
            live_through(settings).frames, 2, std::to_string(rate_hz));
        ASSERT_EQ(said.size(), 5u);
        EXPECT_NEAR(said[0], 150.0, 20.0);
        EXPECT_GT(said[1], 0.85);
        EXPECT_NEAR(said[2], 2.0, 0.5);
        EXPECT_LT(said[3], 0.2);
        EXPECT_NEAR(said[4], 0.5, 1e-4);
    }
}

TEST_F(RhythmsInSciPy, HumHasTheHarmonicsAskedForWithinTheRippleBand) {
    for (const double mains_hz : {50.0, 60.0}) {
        auto settings = silent(1);
        settings.duration_s = 30.0;
        settings.mains = {20.0, mains_hz, 0.4, 0.3, 0.2, 0.1, 0.0, 60.0};
        const auto said =
            test::ask_scipy("f, p = signal.welch(x[:,0], 1250, nperseg=12500, scaling='spectrum', window='flattop')\n"
                            "for k in range(1, 7): print(np.sqrt(2 * p[np.argmin(abs(f - k * float(sys.argv[2])))]))",
                            live_through(settings).frames, 1, std::to_string(mains_hz));
        ASSERT_EQ(said.size(), 6u);
        for (std::size_t k = 0; k < 6; ++k) {
            EXPECT_NEAR(said[k], (std::vector{20.0, 8.0, 6.0, 4.0, 2.0, 0.0})[k], 0.1) << k + 1 << " x " << mains_hz;
        }
    }
}

TEST(Hum, WandersSlowlyInSize) {
    auto settings = silent(1);
    settings.duration_s = 1200.0;
    settings.mains.amplitude_uv = 20.0;
    settings.mains.drift_log_sd = 0.3;
    settings.mains.drift_s = 60.0;
    const auto frames = live_through(settings).frames;
    std::vector<double> logs; // of each second's rms
    for (std::size_t from = 0; from + 1250 <= frames.size(); from += 1250) {
        double squares = 0.0;
        for (std::size_t i = from; i < from + 1250; ++i) {
            squares += static_cast<double>(frames[i]) * frames[i] / 1250.0;
        }
        logs.push_back(0.5 * std::log(squares));
    }
    double mean = 0.0, variance = 0.0, change = 0.0;
    for (const double each : logs) {
        mean += each / static_cast<double>(logs.size());
    }
    for (std::size_t i = 0; i < logs.size(); ++i) {
        variance += (logs[i] - mean) * (logs[i] - mean) / static_cast<double>(logs.size());
        change = i == 0 ? 0.0 : std::max(change, std::abs(logs[i] - logs[i - 1]));
    }
    EXPECT_NEAR(std::sqrt(variance), 0.3, 0.05);
    EXPECT_LT(change, 0.15) << "from second to second";
}

} // namespace
} // namespace millpond
