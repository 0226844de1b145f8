#include "base/refusal.hpp"
#include "support/python.hpp"
#include "support/text.hpp"
#include "synth/all_frames.hpp"
#include "synth/bare_scene.hpp"
#include "synth/scene.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

using test::all_frames;
using test::bare;

SceneSettings everything() {
    SceneSettings settings;
    settings.duration_s = 20.0;
    settings.quiet_start_s = 1.0;
    settings.reference = true;
    settings.theta.amplitude_uv = 200.0;
    settings.mains.amplitude_uv = 10.0;
    settings.artefacts.steps_per_min = 10.0;
    settings.artefacts.muscle_per_min = 10.0;
    return settings;
}

TEST(Scene, SameSeedGivesTheSameBitsAtAnyBlockSize) {
    const auto whole = all_frames(Scene::make(everything()));
    for (const std::size_t block : {1u, 7u, 64u, 1000u}) {
        auto scene = Scene::make(everything());
        std::vector<float> frames(block * 5);
        std::vector<float> all;
        while (const auto made = scene.next(frames)) {
            all.insert(all.end(), frames.begin(), frames.begin() + static_cast<std::ptrdiff_t>(made * 5));
        }
        ASSERT_EQ(all, whole) << block << " frames a block";
    }
    EXPECT_EQ(whole.size(), 5u * 25'000u);
}

TEST(Scene, AnotherSeedGivesAnotherRecording) {
    auto other = everything();
    other.seed = 2;
    EXPECT_NE(all_frames(Scene::make(other)), all_frames(Scene::make(everything())));
}

TEST(Scene, AnElementMoreChangesNoRippleAndNoBackground) {
    auto with = everything();
    auto without = everything();
    without.theta.amplitude_uv = without.mains.amplitude_uv = 0.0;
    without.artefacts = {};
    auto a = Scene::make(with);
    auto b = Scene::make(without);
    std::vector<float> frames(a.frames() * 5);
    a.next(frames);
    b.next(frames);
    ASSERT_EQ(a.truth().size(), b.truth().size());
    for (std::size_t i = 0; i < a.truth().size(); ++i) {
        EXPECT_EQ(a.truth()[i].onset, b.truth()[i].onset);
    }
}

TEST(Scene, ChannelsAreSitesThenTheReference) {
    const auto channels = Scene::make(everything()).channels();
    ASSERT_EQ(channels.size(), 5u);
    EXPECT_EQ(channels[0], (Channel{"site1", ChannelRole::ripple}));
    EXPECT_EQ(channels[4], (Channel{"reference", ChannelRole::reference}));
}

TEST(Scene, RefusesSettingsThatContradictEachOther) {
    const auto refusal = [](auto change) {
        SceneSettings settings;
        change(settings);
        return test::line_of<Refusal>([&] { static_cast<void>(Scene::make(settings, "rest.yaml")); });
    };
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.ripples.rate_per_s = 5.0; }), "rest.yaml: ripples.rate_per_s"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.sharp_wave.duration_ms = 300.0; }), "sharp_wave.duration_ms"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.ripples.start_hz = 600.0; }), "below 0.45 of rate_hz"));
    EXPECT_TRUE(test::says(refusal([](auto& s) {
                               s.rate_hz = 500.0;
                               s.ripples.start_hz = 150.0;
                               s.mains.amplitude_uv = 1.0;
                           }),
                           "mains.frequency_hz"));
    EXPECT_TRUE(test::says(refusal([](auto& s) {
                               s.ripples.rate_per_s = 3.0;
                               s.ripples.doublet_share = 0.8;
                               s.ripples.doublet_least_ms = s.ripples.doublet_most_ms = 400.0;
                           }),
                           "less with doublets"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.ripples.doublet_least_ms = 300.0; }), "doublet_least_ms"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.gamma.low_hz = 150.0; }), "gamma.low_hz"));
    EXPECT_TRUE(test::says(refusal([](auto& s) {
                               s.gamma.rate_per_s = 1.0;
                               s.gamma.high_hz = 700.0;
                           }),
                           "gamma.high_hz"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.spike_bursts.least_spikes = 7; }), "spike_bursts.least_spikes"));
    EXPECT_TRUE(test::says(refusal([](auto& s) {
                               s.spike_bursts.share_of_cycles = 0.5;
                               s.spike_bursts.site = 5;
                           }),
                           "a site, here 1 to 4"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.faults.dead_site = 5; }), "faults.dead_site"));
    EXPECT_TRUE(test::says(refusal([](auto& s) { s.faults.failing_site = 9; }), "faults.failing_site"));
}

class ManyRipples : public ::testing::Test {
  protected:
    static void SetUpTestSuite() {
        auto settings = bare();
        settings.duration_s = 8000.0;
        auto scene = Scene::make(settings);
        std::vector<float> frames(100'000);
        while (scene.next(frames) != 0) {
        }
        truth_ = scene.truth();
    }
    static double seconds(std::uint64_t frames) { return static_cast<double>(frames) / 1250.0; }
    static std::vector<RippleTruth> truth_;
};
std::vector<RippleTruth> ManyRipples::truth_;

// Waiting times are min_gap + an exponential of mean about 1.8 s, so the count's deviation is below that of a Poisson
// count.
TEST_F(ManyRipples, ComeAtTheRateAskedFor) {
    const double expected = 0.5 * (8000.0 - 15.0);
    EXPECT_NEAR(static_cast<double>(truth_.size()), expected, 3.0 * std::sqrt(expected));
}

TEST_F(ManyRipples, LeaveTheQuietStartAndTheLeastGap) {
    EXPECT_GE(seconds(truth_.front().onset.value), 15.0);
    for (std::size_t i = 1; i < truth_.size(); ++i) {
        ASSERT_GE(seconds(truth_[i].onset - truth_[i - 1].end), 0.1);
    }
}

// Mean 96.7 ms: Deceuninck & Kloosterman 2024. Drawing values beyond 2.5 deviations again lowers the mean by about 2 %.
TEST_F(ManyRipples, HaveLogNormalDurationsOfThePublishedMean) {
    double sum = 0.0, log_sum = 0.0, log_squares = 0.0, long_ones = 0.0;
    for (const auto& ripple : truth_) {
        const double ms = 1000.0 * seconds(ripple.end - ripple.onset);
        sum += ms;
        log_sum += std::log(ms);
        log_squares += std::log(ms) * std::log(ms);
        long_ones += ms > 100.0 ? 1.0 : 0.0;
    }
    const auto count = static_cast<double>(truth_.size());
    EXPECT_NEAR(sum / count, 96.7, 4.0);
    EXPECT_NEAR(std::sqrt(log_squares / count - log_sum * log_sum / count / count), 0.45, 0.04);
    EXPECT_NEAR(long_ones / count, 0.38, 0.04);
}

// Median 160 uV, quartiles 118 and 195: Deceuninck & Kloosterman 2024. With a median of 160 and a log SD of 0.37 the
// quartiles of a log-normal law are 125 and 205.
TEST_F(ManyRipples, HaveLogNormalAmplitudes) {
    std::vector<double> amplitudes;
    for (const auto& ripple : truth_) {
        amplitudes.push_back(ripple.amplitude_uv);
    }
    std::sort(amplitudes.begin(), amplitudes.end());
    EXPECT_NEAR(amplitudes[amplitudes.size() / 2], 160.0, 6.0);
    EXPECT_NEAR(amplitudes[amplitudes.size() / 4], 160.0 * std::exp(-0.6745 * 0.37), 6.0);
    EXPECT_NEAR(amplitudes[amplitudes.size() * 3 / 4], 160.0 * std::exp(0.6745 * 0.37), 8.0);
}

TEST(Ripples, NoneIsCutByTheRecordingsEnd) {
    for (std::uint64_t seed = 1; seed <= 50; ++seed) {
        auto settings = bare();
        settings.seed = seed;
        settings.quiet_start_s = 0.0;
        settings.ripples.rate_per_s = 4.0;
        settings.duration_s = 3.0;
        auto scene = Scene::make(settings);
        std::vector<float> frames(scene.frames());
        scene.next(frames);
        ASSERT_FALSE(scene.truth().empty());
        ASSERT_LT(scene.truth().back().end.value, 3750u);
        ASSERT_LT(std::abs(frames.back()), 1.0f) << "nothing is left at the end";
    }
}

TEST(Ripples, RateZeroGivesNone) {
    auto settings = bare();
    settings.ripples.rate_per_s = 0.0;
    const auto frames = all_frames(Scene::make(settings));
    EXPECT_TRUE(std::all_of(frames.begin(), frames.end(), [](float value) { return value == 0.0f; }));
}

TEST(Ripples, AreLargestInTheLayerAndAbsentFromTheReference) {
    auto settings = bare();
    settings.sites = 5;
    settings.site_spacing_um = 60.0;
    settings.reference = true;
    settings.duration_s = 30.0;
    const auto frames = all_frames(Scene::make(settings));
    std::vector<float> most(6);
    for (std::size_t i = 0; i < frames.size(); ++i) {
        most[i % 6] = std::max(most[i % 6], std::abs(frames[i]));
    }
    EXPECT_GT(most[2], most[1]);
    EXPECT_GT(most[1], most[0]);
    // Gaussian profile: 120 um is one spread from the middle.
    EXPECT_NEAR(most[0] / most[2], std::exp(-0.5), 1e-3);
    EXPECT_EQ(most[5], 0.0f);
}

// Liu et al. 2022: negative in stratum radiatum, that is below the layer.
TEST(SharpWaves, AreNegativeBelowTheLayerAndTurnAboveIt) {
    auto settings = bare();
    settings.sites = 3;
    settings.site_spacing_um = 150.0;
    settings.ripples.amplitude_uv = 0.0;
    settings.sharp_wave.amplitude_uv = 300.0;
    settings.ripples.amplitude_log_sd = 0.0;
    settings.duration_s = 30.0;
    const auto frames = all_frames(Scene::make(settings));
    float above = 0.0f, within = 0.0f, below = 0.0f;
    for (std::size_t i = 0; i < frames.size(); i += 3) {
        above = std::max(above, frames[i]);
        within = std::max(within, std::abs(frames[i + 1]));
        below = std::min(below, frames[i + 2]);
    }
    EXPECT_NEAR(above, 300.0f, 3.0f);
    EXPECT_EQ(within, 0.0f);
    EXPECT_NEAR(below, -300.0f, 3.0f);
}

class ToSciPy : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
};

// scipy.signal.hilbert's envelope of the noise-free ripples: where it first and last exceeds a tenth of its peak, how
// high the peak is, and the frequency there from its phase.
TEST_F(ToSciPy, TruthIsWhatTheNoiseFreeEnvelopeSays) {
    auto settings = bare();
    settings.rate_hz = 10'000.0;
    settings.duration_s = 40.0;
    settings.quiet_start_s = 1.0;
    auto scene = Scene::make(settings);
    std::vector<float> frames(scene.frames());
    scene.next(frames);
    std::string peaks;
    for (const auto& ripple : scene.truth()) {
        peaks += std::to_string(ripple.peak.value) + " ";
    }
    const auto said = test::ask_scipy(
        "a = signal.hilbert(x[:,0]); e = np.abs(a); f = np.diff(np.unwrap(np.angle(a))) * 1e4 / 2 / np.pi\n"
        "for p in map(int, sys.argv[2:]):\n"
        "    tenth = e[p] / 10\n"
        "    first = p - np.argmax(e[p::-1] <= tenth) + 1; last = p + np.argmax(e[p:] <= tenth) - 1\n"
        "    print(first, last, e[p], f[p-20:p+20].mean())\n",
        frames, 1, peaks);
    ASSERT_GE(scene.truth().size(), 10u);
    ASSERT_EQ(said.size(), 4 * scene.truth().size());
    for (std::size_t i = 0; i < scene.truth().size(); ++i) {
        const auto& ripple = scene.truth()[i];
        // The analytic signal of so short a wave is its envelope but for a fraction of a period: 1.5 ms is a quarter.
        EXPECT_NEAR(static_cast<double>(ripple.onset.value), said[4 * i], 15.0);
        EXPECT_NEAR(static_cast<double>(ripple.end.value), said[4 * i + 1], 15.0);
        EXPECT_NEAR(ripple.amplitude_uv / said[4 * i + 2], 1.0, 0.02);
        EXPECT_NEAR(ripple.frequency_hz, said[4 * i + 3], 3.0);
    }
}

// scipy.signal.welch: slope of the background's power on logarithmic axes, its size, and what channels have in common.
TEST_F(ToSciPy, BackgroundHasSlopeSizeAndSharedPartAsAskedFor) {
    const std::vector<double> slopes{1.0, 1.5, 2.0};
    std::vector<float> all(slopes.size() * 2 * 375'000);
    for (std::size_t k = 0; k < slopes.size(); ++k) {
        SceneSettings settings;
        settings.sites = 2;
        settings.duration_s = 300.0;
        settings.ripples.rate_per_s = 0.0;
        settings.background.slope = slopes[k];
        settings.background.amplifier_uv = 0.0;
        const auto frames = all_frames(Scene::make(settings));
        for (std::size_t i = 0; i < 375'000; ++i) {
            all[6 * i + 2 * k] = frames[2 * i];
            all[6 * i + 2 * k + 1] = frames[2 * i + 1];
        }
    }
    const auto said = test::ask_scipy("f, p = signal.welch(x, 1250, nperseg=8192, axis=0); s = (f > 3) & (f < 250)\n"
                                      "for k in range(0, 6, 2):\n"
                                      "    print(np.polyfit(np.log(f[s]), np.log(p[s, k]), 1)[0], x[:,k].std(),"
                                      " np.corrcoef(x[:,k:k+2].T)[0, 1])",
                                      all, 6);
    ASSERT_EQ(said.size(), 9u);
    for (std::size_t k = 0; k < slopes.size(); ++k) {
        EXPECT_NEAR(said[3 * k], -slopes[k], 0.12);
        EXPECT_NEAR(said[3 * k + 1], 250.0, 15.0) << "slow noise: 300 s hold some hundred independent values";
        EXPECT_NEAR(said[3 * k + 2], 0.7, 0.05);
    }
}

TEST_F(ToSciPy, RipplesHaveTheirPowerInTheRippleBand) {
    SceneSettings settings;
    settings.sites = 1;
    settings.duration_s = 120.0;
    auto scene = Scene::make(settings);
    std::vector<float> frames(scene.frames());
    scene.next(frames);
    std::string places;
    for (const auto& ripple : scene.truth()) {
        places += std::to_string(ripple.peak.value) + " ";
    }
    // Welch over 128 ms about each peak, against as much of the quiet start.
    const auto said = test::ask_scipy(
        "def power(parts, low, high):\n"
        "    f, p = signal.welch(np.array(parts), 1250, nperseg=128, axis=1); return p[:, (f >= low) & (f <= "
        "high)].mean()\n"
        "ripples = [x[p-80:p+80, 0] for p in map(int, sys.argv[2:])]\n"
        "quiet = [x[i:i+160, 0] for i in range(0, 18000, 160)]\n"
        "print(power(ripples, 140, 210) / power(quiet, 140, 210), power(ripples, 300, 500) / power(quiet, 300, 500))",
        frames, 1, places);
    ASSERT_EQ(said.size(), 2u);
    EXPECT_GT(said[0], 5.0);
    EXPECT_NEAR(said[1], 1.0, 0.3) << "nothing above the band";
}

TEST_F(ToSciPy, ThetaAndMainsStandWhereAskedFor) {
    auto settings = bare();
    settings.duration_s = 60.0;
    settings.ripples.rate_per_s = 0.0;
    settings.theta.amplitude_uv = 100.0;
    settings.mains.amplitude_uv = 20.0;
    const auto said =
        test::ask_scipy("f, p = signal.welch(x[:,0], 1250, nperseg=12500, scaling='spectrum', window='flattop')\n"
                        "at = lambda hz: np.sqrt(2 * p[np.argmin(abs(f - hz))])\n"
                        "print(f[np.argmax(p)], at(50), at(150), at(250), x.std())",
                        all_frames(Scene::make(settings)), 1);
    ASSERT_EQ(said.size(), 5u);
    EXPECT_NEAR(said[0], 7.5, 1.0);
    EXPECT_NEAR(said[1], 20.0, 0.2);
    EXPECT_NEAR(said[2], 6.0, 0.1);
    EXPECT_NEAR(said[3], 3.0, 0.1);
    EXPECT_NEAR(said[4], std::sqrt((100.0 * 100.0 + 20.0 * 20.0 * (1.0 + 0.09 + 0.0225)) / 2.0), 1.0);
}

TEST(Artefacts, AreTheSameOnAllChannelsAndTheReference) {
    auto settings = bare();
    settings.sites = 2;
    settings.reference = true;
    settings.ripples.rate_per_s = 0.0;
    settings.duration_s = 120.0;
    settings.artefacts.steps_per_min = 10.0;
    settings.artefacts.muscle_per_min = 10.0;
    const auto frames = all_frames(Scene::make(settings));
    int jumps = 0;
    for (std::size_t i = 0; i < frames.size(); i += 3) {
        ASSERT_EQ(frames[i], frames[i + 1]);
        ASSERT_EQ(frames[i], frames[i + 2]);
        jumps += i > 0 && std::abs(frames[i] - frames[i - 3]) > 1500.0f ? 1 : 0;
    }
    EXPECT_NEAR(jumps, 20, 13) << "steps of 3000 uV, 3 deviations of a Poisson count";
}

TEST(Artefacts, BurstsAreFastNoiseOfTheSizeAskedFor) {
    auto settings = bare();
    settings.ripples.rate_per_s = 0.0;
    settings.duration_s = 600.0;
    settings.artefacts.muscle_per_min = 30.0;
    const auto frames = all_frames(Scene::make(settings));
    // A Hann window's mean square is 3/8 of its peak's; bursts fill muscle_ms of every muscle_ms + waiting time.
    double squares = 0.0, busy = 0.0;
    for (const float value : frames) {
        squares += static_cast<double>(value) * value;
        busy += value != 0.0f ? 1.0 : 0.0;
    }
    EXPECT_NEAR(std::sqrt(squares / busy), 200.0 * std::sqrt(3.0 / 8.0), 8.0);
    EXPECT_NEAR(busy / static_cast<double>(frames.size()), 0.3 / 2.3, 0.03);
}

} // namespace
} // namespace millpond
