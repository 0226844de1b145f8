#include "support/python.hpp"
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::live_through;
using test::silent;

SceneSettings bursts_alone(double rate_hz) {
    auto settings = silent(4, true);
    settings.rate_hz = rate_hz;
    settings.duration_s = rate_hz > 2000.0 ? 20.0 : 60.0;
    settings.spike_bursts.share_of_cycles = 0.5;
    settings.spike_bursts.site = 2;
    return settings;
}

class SpikesInSciPy : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
};

// scipy.signal.find_peaks on the noise-free recording. 3-6 spikes 2-6 ms apart, smaller and smaller: from memory.
TEST_F(SpikesInSciPy, BurstsAreThreeToSixSpikesTwoToSixMsApart) {
    const auto lived = live_through(bursts_alone(10'000.0));
    const auto bursts = lived.of(HappeningKind::spikes);
    EXPECT_NEAR(static_cast<double>(bursts.size()), 0.5 * 7.5 * 20.0, 28.0) << "half of theta's cycles";
    const auto said =
        test::ask_scipy("y = -x[:,1]; at, _ = signal.find_peaks(y, height=20, distance=10)\n"
                        "gap = np.diff(at) / 10; first = np.r_[0, np.flatnonzero(gap > 15) + 1, len(at)]\n"
                        "size = np.diff(first); inner = gap[gap <= 15]; down = (y[at[1:]] / y[at[:-1]])[gap <= 15]\n"
                        "print(len(size), size.min(), size.max(), inner.min(), inner.max(), np.median(down),"
                        " np.median(y[at[first[:-1]]]))",
                        lived.frames, 5);
    ASSERT_EQ(said.size(), 7u);
    EXPECT_EQ(said[0], static_cast<double>(bursts.size()));
    EXPECT_EQ(said[1], 3.0);
    EXPECT_EQ(said[2], 6.0);
    EXPECT_NEAR(said[3], 2.0, 0.2);
    EXPECT_NEAR(said[4], 6.0, 0.2);
    EXPECT_NEAR(said[5], 0.85, 0.03);
    EXPECT_NEAR(said[6], 400.0, 80.0) << "median of a log-normal law with log SD 0.4";
}

TEST_F(SpikesInSciPy, BurstsLeakIntoTheRippleBandAndMoreIntoTheOneAbove) {
    for (const double rate_hz : {1250.0, 5000.0}) {
        const auto said = test::ask_scipy(
            "fs = float(sys.argv[2])\n"
            "def rms(low, high):\n"
            "    return signal.sosfilt(signal.butter(3, (low, high), 'band', fs=fs, output='sos'), x[:,1]).std()\n"
            "print(rms(150, 250), rms(320, 560))",
            live_through(bursts_alone(rate_hz)).frames, 5, std::to_string(rate_hz));
        ASSERT_EQ(said.size(), 2u);
        EXPECT_GT(said[0], 3.0) << rate_hz;
        EXPECT_GT(said[1], said[0]);
    }
}

// The truth's onset is half a spike's width before the first spike; phase by scipy.signal.hilbert of theta alone.
TEST_F(SpikesInSciPy, BurstsAreLockedToTheta) {
    auto settings = bursts_alone(1250.0);
    settings.theta.amplitude_uv = 200.0;
    settings.spike_bursts.amplitude_uv = 0.0;
    settings.spike_bursts.phase_turns = 0.6;
    const auto lived = live_through(settings);
    std::string onsets;
    for (const auto& burst : lived.of(HappeningKind::spikes)) {
        onsets += std::to_string(burst.onset_s + 0.0005) + " ";
    }
    const auto said = test::ask_scipy("turns = np.angle(signal.hilbert(x[:,0])) / 2 / np.pi + 0.25\n"
                                      "at = (np.array(sys.argv[2:], float) * 1250).astype(int)\n"
                                      "at = at[(at > 500) & (at < len(x) - 500)]\n"
                                      "m = np.exp(2j * np.pi * turns[at]).mean()\n"
                                      "print(abs(m), np.angle(m) / 2 / np.pi % 1)",
                                      lived.frames, 5, onsets);
    ASSERT_EQ(said.size(), 2u);
    EXPECT_GT(said[0], 0.8) << "a deviation of 0.08 turns leaves 0.88";
    EXPECT_NEAR(said[1], 0.6, 0.02);
}

TEST(SpikeBursts, FallWithDistanceAndLeaveTheReferenceAlone) {
    const auto frames = live_through(bursts_alone(5000.0)).frames;
    std::vector<float> most(5);
    for (std::size_t i = 0; i < frames.size(); ++i) {
        most[i % 5] = std::max(most[i % 5], std::abs(frames[i]));
    }
    EXPECT_NEAR(most[0] / most[1], std::exp(-1.0), 1e-3) << "40 um away";
    EXPECT_NEAR(most[2] / most[1], std::exp(-1.0), 1e-3);
    EXPECT_NEAR(most[3] / most[1], std::exp(-2.0), 1e-3);
    EXPECT_EQ(most[4], 0.0f);
}

TEST(SpikeBursts, StayAwayInRest) {
    auto settings = bursts_alone(1250.0);
    settings.duration_s = 300.0;
    settings.states.rest_s = settings.states.run_s = 15.0;
    const auto lived = live_through(settings);
    const auto runs = lived.of(HappeningKind::run);
    ASSERT_GE(lived.of(HappeningKind::spikes).size(), 100u);
    for (const auto& burst : lived.of(HappeningKind::spikes)) {
        EXPECT_TRUE(std::any_of(runs.begin(), runs.end(), [&](const auto& run) {
            return burst.onset_s > run.onset_s - 0.001 && burst.onset_s < run.end_s;
        }));
    }
}

SceneSettings single_spikes(double rate_hz) {
    auto settings = silent(4, true);
    settings.rate_hz = rate_hz;
    settings.duration_s = 40.0;
    settings.seed = 2; // no two at once
    settings.artefacts.spikes_per_min = 30.0;
    return settings;
}

TEST(SingleSpikes, AreOfOneChannelAloneAndAsLargeAndShortAsAskedFor) {
    const auto lived = live_through(single_spikes(30'000.0));
    const auto spikes = lived.of(HappeningKind::spike);
    EXPECT_NEAR(static_cast<double>(spikes.size()), 20.0, 15.0);
    std::vector<int> on_channel(5);
    for (const auto& spike : spikes) {
        EXPECT_GE(spike.end_s - spike.onset_s, 0.0002 - 1e-9);
        EXPECT_LE(spike.end_s - spike.onset_s, 0.001 + 1e-9);
        std::vector<float> most(5);
        const auto from = static_cast<std::size_t>(spike.onset_s * 30e3),
                   to = static_cast<std::size_t>(spike.end_s * 30e3);
        for (std::size_t i = 5 * from; i < 5 * to + 5; ++i) {
            most[i % 5] = std::max(most[i % 5], std::abs(lived.frames[i]));
        }
        EXPECT_EQ(std::count(most.begin(), most.end(), 0.0f), 4) << "one channel";
        const auto highest = std::max_element(most.begin(), most.end());
        // The amplifier smooths over 0.015 ms, which takes 6 % from a spike of 0.2 ms; samples lie beside the peak.
        EXPECT_NEAR(*highest, 1500.0f, 200.0f);
        ++on_channel[static_cast<std::size_t>(highest - most.begin())];
    }
    EXPECT_EQ(std::count(on_channel.begin(), on_channel.end(), 0), 0) << "any channel, the reference too";
}

// What a slow recording shows of the same spikes is what a fast one shows after decimation: scipy.signal.decimate with
// its linear-phase filter, compared within 150-250 Hz, where an alias would show.
TEST_F(SpikesInSciPy, SlowRatesShowWhatFilteringAndDecimationLeave) {
    const auto slow = live_through(single_spikes(1250.0)).frames;
    const auto fast = live_through(single_spikes(10'000.0)).frames;
    std::vector<float> both;
    for (std::size_t i = 0; i < slow.size() / 5; ++i) {
        for (std::size_t k = 0; k < 8; ++k) {
            both.push_back(fast[(8 * i + k) * 5]);
            both.push_back(slow[5 * i]);
        }
    }
    const auto said = test::ask_scipy("b = signal.butter(3, (150, 250), 'band', fs=1250, output='sos')\n"
                                      "fast = signal.resample_poly(x[:,0], 1, 8); slow = x[::8,1]\n"
                                      "fast, slow = signal.sosfiltfilt(b, fast), signal.sosfiltfilt(b, slow)\n"
                                      "print(slow.std() / fast.std(), np.corrcoef(slow, fast)[0, 1])",
                                      both, 2);
    ASSERT_EQ(said.size(), 2u);
    EXPECT_NEAR(said[0], 0.9, 0.1) << "the bell takes a tenth at 200 Hz";
    EXPECT_GT(said[1], 0.9);
}

} // namespace
} // namespace millpond
