// Mains hum taken out adaptively: what it brings, what it costs, what it leaves behind.
#include "base/refusal.hpp"
#include "detector/detection_trial.hpp"
#include "support/python.hpp"
#include "support/signals.hpp"
#include "synth/named_scenes.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <cstring>
#include <numbers>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};

DetectorSettings with_removal(bool on) {
    DetectorSettings settings;
    settings.mains.method = on ? MainsMethod::adaptive : MainsMethod::off;
    return settings;
}

test::Trial typical_with_hum(double hum_uv, double hum_hz, DetectorSettings settings) {
    auto scene = named_scene(SceneName::typical);
    scene.seed = 11;
    scene.duration_s = 200.0;
    scene.mains.amplitude_uv = hum_uv;
    scene.mains.frequency_hz = hum_hz;
    return test::try_detector(scene, settings, 20.0);
}

TEST(MainsRemoval, StrongHumCostsHitsWithoutItAndNextToNoneWithIt) {
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        auto on = with_removal(true), off = with_removal(false);
        on.method = off.method = method;
        const double none = typical_with_hum(0.0, 50.0, off).hit_rate();
        constexpr double hz = 49.95; // the true frequency is nobody's nominal one
        EXPECT_LT(typical_with_hum(300.0, hz, off).hit_rate(), none - 0.15);
        EXPECT_GT(typical_with_hum(300.0, hz, on).hit_rate(),
                  none - (method == DetectionMethod::evidence ? 0.05 : 0.12));
    }
}

TEST(MainsRemoval, WithoutHumNeitherLatencyNorHitRateSuffer) {
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        auto on = with_removal(true), off = with_removal(false);
        on.method = off.method = method;
        const auto without = typical_with_hum(0.0, 50.0, off), with = typical_with_hum(0.0, 50.0, on);
        EXPECT_NEAR(with.median_ms(), without.median_ms(), 0.81); // a frame
        EXPECT_NEAR(with.hit_rate(), without.hit_rate(), 0.02);
    }
}

/// Mean envelope of the first site from `from` up to `to`.
double mean_envelope(const std::vector<float>& data, const DetectorSettings& settings, std::size_t from,
                     std::size_t to) {
    struct Sum {
        std::size_t from, to;
        double value = 0.0;
    } sum{from, to};
    auto detector = Detector::make(settings, ripple_channels(1), rate);
    detector.gap(SampleIndex{0});
    detector.watch(
        [](void* context, SampleIndex at, std::span<const double> envelopes) {
            auto& found = *static_cast<Sum*>(context);
            found.value += at.value >= found.from && at.value < found.to ? envelopes[0] : 0.0;
        },
        &sum);
    for (FrameBlock rest = test::block_of(data, 1); rest.frames() > 0;) {
        std::optional<Crossing> crossing;
        const auto used = detector.run(rest, crossing);
        rest = rest.part(used, rest.frames() - used);
    }
    return sum.value / static_cast<double>(to - from);
}

void add_tone(std::vector<float>& data, double hz, double uv, std::size_t from) {
    for (std::size_t i = from; i < data.size(); ++i) {
        data[i] += static_cast<float>(uv * std::sin(2.0 * std::numbers::pi * hz * static_cast<double>(i) / rate.value));
    }
}

DetectorSettings envelope_of_one_site(bool removal) {
    auto settings = with_removal(removal);
    settings.method = DetectionMethod::envelope;
    settings.vote.rule = VoteRule::count;
    return settings;
}

// A ripple right on the third harmonic is the worst case: SciPy's own 2 Hz notch (iirnotch) beside it.
TEST(MainsRemoval, RingsLessThanATenthOfATwoHertzNotchAfterARipple) {
    MILLPOND_NEEDS_SCIPY();
    constexpr std::size_t burst_at = 30 * 1250, length = 100, from = burst_at + length + 75, to = from + 125;
    const auto noise = test::white_noise(40 * 1250, 1, 10.0, 3);
    auto data = noise;
    test::add_burst(data, 1, burst_at, length, rate.value, 150.0, 200.0);
    const double left = mean_envelope(data, envelope_of_one_site(true), from, to) -
                        mean_envelope(noise, envelope_of_one_site(true), from, to);
    std::vector<float> burst(40 * 1250);
    test::add_burst(burst, 1, burst_at, length, rate.value, 150.0, 200.0);
    const auto notch = test::ask_scipy("b, a = signal.iirnotch(150, 75, fs=1250)\n"
                                       "y = np.abs(signal.hilbert(signal.lfilter(b, a, x)))\n"
                                       "tell(y[" +
                                           std::to_string(from) + ":" + std::to_string(to) + "].mean())",
                                       burst);
    ASSERT_EQ(notch.size(), 1U);
    EXPECT_GT(notch[0], 10.0);
    EXPECT_LT(std::abs(left), 0.1 * notch[0]) << notch[0];
}

TEST(MainsRemoval, TakesHumDownTwentyfoldAtFrequenciesBesideTheNominalOne) {
    for (const double hz : {50.0, 49.95, 50.2, 49.5}) {
        auto noise = test::white_noise(60 * 1250, 1, 1.0, 3), data = noise;
        add_tone(data, 3.0 * hz, 100.0, 0);
        add_tone(data, hz, 100.0, 0);
        constexpr std::size_t from = 50 * 1250, to = 60 * 1250;
        const double off = mean_envelope(data, envelope_of_one_site(false), from, to);
        const double on = mean_envelope(data, envelope_of_one_site(true), from, to);
        EXPECT_LT(on, 0.05 * off) << hz << " Hz, " << off;
    }
}

TEST(MainsRemoval, HumThatBeginsMidwayIsLearnedThoughItIsFarAboveTheUsual) {
    auto data = test::white_noise(60 * 1250, 1, 5.0, 3);
    add_tone(data, 150.0, 200.0, 30 * 1250);
    const double during = mean_envelope(data, envelope_of_one_site(true), 30 * 1250 + 200, 31 * 1250);
    const double after = mean_envelope(data, envelope_of_one_site(true), 50 * 1250, 60 * 1250);
    EXPECT_GT(during, 100.0);
    EXPECT_LT(after, 10.0);
}

/// All floors and crossings, byte by byte.
std::size_t crossings(const std::vector<float>& data, const Channels& channels, bool pulses) {
    auto detector = Detector::make(with_removal(true), channels, rate);
    detector.gap(SampleIndex{0});
    FrameBlock rest{SampleIndex{0}, channels.size(), data};
    std::size_t found = 0;
    while (rest.frames() > 0) {
        std::optional<Crossing> crossing;
        const auto used = detector.run(rest, crossing);
        rest = rest.part(used, rest.frames() - used);
        found += crossing ? 1 : 0;
        if (crossing && pulses) {
            detector.blank(crossing->at + 1);
        }
    }
    return found;
}

// Hum goes on while the detector holds its state after a pulse: held with the rest, or left behind as an offset, it
// would come back as an event, and as the next pulse.
TEST(MainsRemoval, PulsesInStrongHumLeadToNoFurtherOnes) {
    auto settings = named_scene(SceneName::typical);
    settings.seed = 12;
    settings.duration_s = 200.0;
    settings.mains.amplitude_uv = 300.0;
    settings.mains.frequency_hz = 49.95;
    auto scene = Scene::make(settings);
    std::vector<float> data(scene.frames() * scene.channels().size());
    scene.next(data);
    const auto without = crossings(data, scene.channels(), false);
    EXPECT_GT(without, 50U);
    EXPECT_NEAR(static_cast<double>(crossings(data, scene.channels(), true)), static_cast<double>(without),
                0.1 * static_cast<double>(without));
}

std::string bytes_of_run(const DetectorSettings& settings, std::size_t block, KernelWidth width) {
    auto scene_settings = named_scene(SceneName::typical);
    scene_settings.duration_s = 40.0;
    scene_settings.mains.amplitude_uv = 100.0;
    auto scene = Scene::make(scene_settings);
    static const auto data = test::samples_of(scene);
    auto detector = Detector::make(settings, scene.channels(), scene.rate(), width);
    detector.gap(SampleIndex{0});
    std::string bytes;
    const FrameBlock whole{SampleIndex{0}, scene.channels().size(), data};
    for (std::size_t at = 0; at < whole.frames();) {
        if (at == 20000) { // 777 frames are missing, in two announcements
            detector.gap(SampleIndex{at + 300});
            detector.gap(SampleIndex{at + 777});
            at += 777;
        }
        const std::size_t end = std::min({at - at % block + block, whole.frames(), at < 20000 ? 20000UL : SIZE_MAX});
        std::optional<Crossing> crossing;
        at += detector.run(whole.part(at, end - at), crossing);
        if (crossing) {
            bytes.append(reinterpret_cast<const char*>(&crossing->at), sizeof crossing->at);
            bytes.append(reinterpret_cast<const char*>(&crossing->detail), sizeof crossing->detail);
            detector.blank(crossing->at + 1);
        }
    }
    for (std::size_t i = 0; i < detector.floor_count(); ++i) {
        const auto floor = detector.floor(i);
        bytes.append(reinterpret_cast<const char*>(&floor), sizeof floor);
    }
    return bytes;
}

TEST(MainsRemoval, SameBitsAtEveryPacketSizeAndVectorWidthAcrossGapsAndPulses) {
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        auto settings = with_removal(true);
        settings.method = method;
        const auto expected = bytes_of_run(settings, 1, KernelWidth::automatic);
        EXPECT_GT(expected.size(), 200U);
        for (const std::size_t block : {7U, 64U, 1000U}) {
            EXPECT_TRUE(bytes_of_run(settings, block, KernelWidth::automatic) == expected) << block;
        }
        const auto widest = Detector::make(settings, ripple_channels(1), rate).width();
        for (const auto width : {KernelWidth::sse2, KernelWidth::avx2, KernelWidth::avx512}) {
            EXPECT_TRUE(width > widest || bytes_of_run(settings, 64, width) == expected) << static_cast<int>(width);
        }
    }
}

TEST(MainsRemoval, AFrequencyTheRateCannotCarryIsRefusedByName) {
    auto settings = with_removal(true);
    settings.mains.frequency_hz = 100.0;
    settings.filter.low_hz = 20.0;
    settings.filter.high_hz = 50.0;
    settings.method = DetectionMethod::envelope;
    try {
        static_cast<void>(Detector::make(settings, ripple_channels(1), Hertz{200.0}));
        FAIL();
    } catch (const Refusal& refusal) {
        EXPECT_NE(std::string(refusal.what()).find("detector.mains.frequency_hz"), std::string::npos);
    }
}

} // namespace
} // namespace millpond
