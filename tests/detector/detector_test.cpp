#include "base/refusal.hpp"
#include "detector/detector.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>
#include <liquid/liquid.h>

#include <algorithm>
#include <cmath>
#include <cstring>
#include <numbers>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};

DetectorSettings quick_settings() {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.filter.order = 2;
    settings.envelope = {EnvelopeMethod::analytic, 4.0};
    settings.floor.settle_s = 2.0;
    settings.floor.time_constant_s = 5.0;
    settings.threshold = {6.0, 2.0, 0.0}; // white noise crosses 4 now and then
    return settings;
}

/// Noise of 20 uV on every channel, 30 s, with a 200 Hz burst of 200 uV and 80 ms once a second from 10 s on.
std::vector<float> noisy_bursts(std::size_t channels, std::uint64_t seed = 7) {
    auto data = test::white_noise(30 * 1250, channels, 20.0, seed);
    for (std::size_t second = 10; second < 30; ++second) {
        test::add_burst(data, channels, second * 1250, 100, rate.value, 200.0, 200.0);
    }
    return data;
}

struct Watched {
    std::vector<std::vector<double>> envelopes;
    std::vector<Crossing> crossings;
    std::vector<FloorDetail> floors;
};

Watched run_whole(Detector& detector, const std::vector<float>& data, std::size_t channels, std::size_t block_frames,
                  bool watch = false) {
    Watched watched;
    if (watch) {
        detector.watch(
            [](void* context, SampleIndex, std::span<const double> envelopes) {
                static_cast<Watched*>(context)->envelopes.emplace_back(envelopes.begin(), envelopes.end());
            },
            &watched);
    }
    const std::size_t frames = data.size() / channels;
    for (std::size_t at = 0; at < frames;) {
        const std::size_t count = std::min(block_frames, frames - at);
        const FrameBlock whole = test::block_of(data, channels);
        std::optional<Crossing> crossing;
        at += detector.run(whole.part(at, count), crossing);
        if (crossing) {
            watched.crossings.push_back(*crossing);
        }
    }
    for (std::size_t i = 0; i < detector.floor_count(); ++i) {
        watched.floors.push_back(detector.floor(i));
    }
    return watched;
}

bool same_bits(const Watched& a, const Watched& b) {
    if (a.crossings.size() != b.crossings.size() || a.floors.size() != b.floors.size()) {
        return false;
    }
    for (std::size_t i = 0; i < a.crossings.size(); ++i) {
        if (a.crossings[i].at != b.crossings[i].at ||
            std::memcmp(&a.crossings[i].detail, &b.crossings[i].detail, sizeof(DetectionDetail)) != 0) {
            return false;
        }
    }
    return std::memcmp(a.floors.data(), b.floors.data(), a.floors.size() * sizeof(FloorDetail)) == 0;
}

std::vector<KernelWidth> widths_here() {
    std::vector<KernelWidth> widths{KernelWidth::sse2};
    if (__builtin_cpu_supports("avx2") != 0) {
        widths.push_back(KernelWidth::avx2);
    }
    if (__builtin_cpu_supports("avx512f") != 0 && __builtin_cpu_supports("avx512dq") != 0) {
        widths.push_back(KernelWidth::avx512);
    }
    return widths;
}

TEST(Detector, FindsEveryLoudBurstOnceAndNothingElse) {
    auto detector = Detector::make(quick_settings(), ripple_channels(4), rate);
    const auto watched = run_whole(detector, noisy_bursts(4), 4, 64);
    ASSERT_EQ(watched.crossings.size(), 20U);
    for (std::size_t i = 0; i < 20; ++i) {
        const auto at = watched.crossings[i].at.value;
        EXPECT_GE(at, (10 + i) * 1250);
        EXPECT_LT(at, (10 + i) * 1250 + 50) << "later than the middle of the burst";
        EXPECT_FALSE(watched.crossings[i].unsettled);
        EXPECT_FALSE(watched.crossings[i].settling);
    }
}

TEST(Detector, GivesTheSameBitsAtAnyBlockSizeAndVectorWidthForEveryFilterEnvelopeAndVote) {
    for (const std::size_t channels : {1U, 5U, 9U}) {
        auto data = noisy_bursts(channels);
        for (const auto family : {FilterFamily::butterworth, FilterFamily::elliptic, FilterFamily::fir_minimum_phase}) {
            for (const auto method : {EnvelopeMethod::rectify, EnvelopeMethod::energy, EnvelopeMethod::analytic}) {
                for (const auto vote : {VoteRule::count, VoteRule::mean}) {
                    auto settings = quick_settings();
                    settings.filter.family = family;
                    settings.envelope.method = method;
                    settings.vote.rule = vote;
                    auto first = Detector::make(settings, ripple_channels(channels), rate, KernelWidth::sse2);
                    const auto expected = run_whole(first, data, channels, 1);
                    ASSERT_GE(expected.crossings.size(), 15U);
                    for (const auto width : widths_here()) {
                        for (const std::size_t block : {7U, 64U, 1000U}) {
                            auto detector = Detector::make(settings, ripple_channels(channels), rate, width);
                            EXPECT_TRUE(same_bits(expected, run_whole(detector, data, channels, block)))
                                << channels << " channels, width " << static_cast<int>(width) << ", block " << block;
                        }
                    }
                }
            }
        }
    }
}

// Reference: liquid-dsp's own second-order-section filter, fed with the same coefficients. It computes in single
// precision; at 1250 Hz its error is far below a ten-thousandth of full scale. The rectified, unsmoothed envelope is
// the magnitude of the filter's output.
void compare_to_liquid(Hertz at_rate, double tolerance) {
    const std::size_t frames = 20000, channels = 3;
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.filter.order = 4;
    settings.envelope = {EnvelopeMethod::rectify, 0.0};
    settings.vote.rule = VoteRule::count;
    auto detector = Detector::make(settings, ripple_channels(channels), at_rate);
    auto data = test::white_noise(frames, channels, 0.2, 3);
    std::fill_n(data.begin(), channels, 0.0F); // the detector takes the first sample as level
    const auto watched = run_whole(detector, data, channels, 64, true);
    for (std::size_t channel = 0; channel < channels; ++channel) {
        std::vector<float> b, a;
        for (const auto& s : detector.bandpass().sections) {
            for (const double value : {s.b0, s.b1, s.b2}) {
                b.push_back(static_cast<float>(value));
            }
            for (const double value : {1.0, s.a1, s.a2}) {
                a.push_back(static_cast<float>(value));
            }
        }
        iirfilt_rrrf liquid =
            iirfilt_rrrf_create_sos(b.data(), a.data(), static_cast<unsigned>(detector.bandpass().sections.size()));
        double worst = 0.0;
        for (std::size_t i = 0; i < frames; ++i) {
            float out = 0.0F;
            iirfilt_rrrf_execute(liquid, data[i * channels + channel], &out);
            worst = std::max(worst, std::abs(std::abs(static_cast<double>(out)) - watched.envelopes[i][channel]));
        }
        iirfilt_rrrf_destroy(liquid);
        EXPECT_LT(worst, tolerance) << "channel " << channel << " at " << at_rate.value;
    }
}

TEST(Detector, FiltersAsLiquidDoesWithinATenThousandthOfFullScale) {
    compare_to_liquid(Hertz{1250.0}, 1e-4);
    compare_to_liquid(Hertz{30000.0}, 1e-4);
}

// Rayleigh law (from memory): the envelope of Gaussian noise of SD s has mean 1.2533 s and SD 0.6551 s, and exceeds its
// mean by 3 SD with p = 0.0056.
TEST(Detector, EnvelopeOfBandNoiseFollowsTheRayleighLaw) {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.filter.order = 4;
    settings.envelope = {EnvelopeMethod::analytic, 0.0};
    settings.filter.low_hz = 190.0;
    settings.filter.high_hz = 210.0; // narrow: a first-order all-pass turns by 90 degrees at the centre only
    settings.vote.rule = VoteRule::count;
    auto detector = Detector::make(settings, ripple_channels(8), rate);
    const auto data = test::white_noise(600 * 1250, 8, 100.0, 11);
    const auto watched = run_whole(detector, data, 8, 1000, true);
    double sum = 0.0, squares = 0.0, count = 0.0;
    const auto each_envelope = [&](auto&& take) {
        for (std::size_t i = 2500; i < watched.envelopes.size(); ++i) {
            for (const double value : watched.envelopes[i]) {
                take(value);
            }
        }
    };
    each_envelope([&](double value) {
        sum += value;
        squares += value * value;
        count += 1.0;
    });
    const double mean = sum / count, sd = std::sqrt(squares / count - mean * mean);
    EXPECT_NEAR(sd / mean, 0.6551 / 1.2533, 0.01);
    double over = 0.0;
    each_envelope([&](double value) { over += value > mean + 3.0 * sd ? 1.0 : 0.0; });
    EXPECT_NEAR(over / count, 0.0056, 0.0015);
}

TEST(Detector, FloorIsNotMovedByRipplesThatFillATenthOfTheTime) {
    const auto quiet = test::white_noise(60 * 1250, 1, 20.0, 5);
    auto busy = quiet;
    for (std::size_t second = 10; second < 60; ++second) {
        test::add_burst(busy, 1, second * 1250, 125, rate.value, 200.0, 300.0);
    }
    const auto floor_after = [&](const std::vector<float>& data) {
        auto detector = Detector::make(quick_settings(), ripple_channels(1), rate);
        return run_whole(detector, data, 1, 1000).floors.front();
    };
    const auto plain = floor_after(quiet), with_ripples = floor_after(busy);
    EXPECT_NEAR(with_ripples.mean / plain.mean, 1.0, 0.1);
    EXPECT_NEAR(with_ripples.deviation / plain.deviation, 1.0, 0.2);
}

TEST(Detector, StartUpArtefactDoesNotPoisonTheFloor) {
    auto data = test::white_noise(20 * 1250, 1, 20.0, 5);
    const auto clean = data;
    test::add_burst(data, 1, 200, 250, rate.value, 200.0, 20000.0);
    const auto mean_after = [&](const std::vector<float>& samples) {
        auto detector = Detector::make(quick_settings(), ripple_channels(1), rate);
        return run_whole(detector, samples, 1, 1000).floors.front().mean;
    };
    EXPECT_NEAR(mean_after(data) / mean_after(clean), 1.0, 0.15);
}

TEST(Detector, DoesNotCrossAgainBeforeTheEnvelopeFellBelowTheRearmLevel) {
    auto data = test::white_noise(20 * 1250, 1, 20.0, 5);
    // Two seconds of loud 200 Hz without a pause: one crossing.
    for (std::size_t i = 12 * 1250; i < 14 * 1250; ++i) {
        data[i] +=
            static_cast<float>(300.0 * std::sin(2.0 * std::numbers::pi * 200.0 * static_cast<double>(i) / rate.value));
    }
    auto detector = Detector::make(quick_settings(), ripple_channels(1), rate);
    EXPECT_EQ(run_whole(detector, data, 1, 64).crossings.size(), 1U);
}

TEST(Detector, MinimumTimeAboveDelaysTheCrossingByThatTime) {
    const auto first_at = [&](double min_above_ms) {
        auto settings = quick_settings();
        settings.threshold.min_above_ms = min_above_ms;
        auto detector = Detector::make(settings, ripple_channels(1), rate);
        return run_whole(detector, noisy_bursts(1), 1, 64).crossings.at(0).at.value;
    };
    EXPECT_EQ(first_at(8.0) - first_at(0.0), 9U); // 10 frames of 0.8 ms, the first of which is the crossing itself
}

TEST(Detector, CountVoteNeedsThatManySitesAtOnce) {
    auto data = test::white_noise(20 * 1250, 4, 20.0, 5);
    std::vector<float> burst(100, 0.0F);
    test::add_burst(burst, 1, 0, 100, rate.value, 200.0, 300.0);
    for (std::size_t i = 0; i < burst.size(); ++i) {
        data[(12 * 1250 + i) * 4 + 0] += burst[i]; // sites 0 and 1 only
        data[(12 * 1250 + i) * 4 + 1] += burst[i];
    }
    const auto crossings_with = [&](int needed) {
        auto settings = quick_settings();
        settings.vote = {VoteRule::count, needed};
        auto detector = Detector::make(settings, ripple_channels(4), rate);
        return run_whole(detector, data, 4, 64).crossings.size();
    };
    EXPECT_EQ(crossings_with(2), 1U);
    EXPECT_EQ(crossings_with(3), 0U);
}

TEST(Detector, ReferenceThatRisesTooVetoes) {
    Channels channels = ripple_channels(3);
    channels[1].role = ChannelRole::reference;
    auto data = noisy_bursts(3); // bursts on all three
    auto detector = Detector::make(quick_settings(), channels, rate);
    const auto watched = run_whole(detector, data, 3, 64);
    ASSERT_GE(watched.crossings.size(), 15U);
    const auto vetoed = std::count_if(watched.crossings.begin(), watched.crossings.end(),
                                      [](const auto& crossing) { return crossing.vetoed; });
    // The noise decides which of the two rises first; a reference a sample later than the sites comes too late.
    EXPECT_GE(vetoed, 1);
    auto quiet_reference = data;
    Detector again = Detector::make(quick_settings(), channels, rate);
    const auto noise = test::white_noise(30 * 1250, 1, 20.0, 99);
    for (std::size_t i = 0; i < noise.size(); ++i) {
        quiet_reference[i * 3 + 1] = noise[i];
    }
    for (const auto& crossing : run_whole(again, quiet_reference, 3, 64).crossings) {
        EXPECT_FALSE(crossing.vetoed);
    }
}

TEST(Detector, UnusedChannelsChangeNothing) {
    const auto plain = noisy_bursts(2);
    std::vector<float> padded;
    for (std::size_t i = 0; i < plain.size(); i += 2) {
        padded.insert(padded.end(), {1e6F * static_cast<float>(i % 3), plain[i], -5e5F, plain[i + 1]});
    }
    Channels channels = ripple_channels(4);
    channels[0].role = channels[2].role = ChannelRole::unused;
    auto two = Detector::make(quick_settings(), ripple_channels(2), rate);
    auto four = Detector::make(quick_settings(), channels, rate);
    const auto a = run_whole(two, plain, 2, 64), b = run_whole(four, padded, 4, 64);
    ASSERT_EQ(a.crossings.size(), b.crossings.size());
    for (std::size_t i = 0; i < a.crossings.size(); ++i) {
        EXPECT_EQ(a.crossings[i].at, b.crossings[i].at);
    }
}

TEST(Detector, BlankingHoldsEverythingAndSplicesWithoutAStep) {
    auto settings = quick_settings();
    settings.blanking_ms = 40.0;
    auto data = test::white_noise(20 * 1250, 1, 20.0, 5);
    // A thousandfold artefact inside the blanking, and another level afterwards.
    for (std::size_t i = 15 * 1250; i < data.size(); ++i) {
        data[i] += i < 15 * 1250 + 50 ? 20000.0F : 500.0F;
    }
    auto detector = Detector::make(settings, ripple_channels(1), rate);
    const FrameBlock whole = test::block_of(data, 1);
    std::optional<Crossing> crossing;
    ASSERT_EQ(detector.run(whole.part(0, 15 * 1250), crossing), 15U * 1250U);
    const auto floor_before = detector.floor(0);
    detector.blank(SampleIndex{15 * 1250});
    ASSERT_EQ(detector.run(whole.part(15 * 1250, 50), crossing), 50U);
    const auto floor_within = detector.floor(0);
    EXPECT_EQ(floor_before.mean, floor_within.mean);
    EXPECT_EQ(floor_before.frames, floor_within.frames);
    EXPECT_EQ(detector.run(whole.part(15 * 1250 + 50, 4 * 1250), crossing), 4U * 1250U);
    EXPECT_FALSE(crossing.has_value());
}

TEST(Detector, AfterAGapItSettlesAgainAndTheFloorTakesNothingFromIt) {
    auto detector = Detector::make(quick_settings(), ripple_channels(1), rate);
    auto data = test::white_noise(40 * 1250, 1, 20.0, 5);
    test::add_burst(data, 1, 20 * 1250, 60, rate.value, 200.0, 2000.0); // begins at once after the gap
    const FrameBlock whole = test::block_of(data, 1);
    std::optional<Crossing> crossing;
    detector.run(whole.part(0, 15 * 1250), crossing);
    const auto before = detector.floor(0);
    detector.gap(SampleIndex{20 * 1250});
    EXPECT_TRUE(detector.settling());
    detector.run(whole.part(20 * 1250, 1250), crossing);
    ASSERT_TRUE(crossing.has_value());
    EXPECT_TRUE(crossing->settling);
    EXPECT_EQ(detector.floor(0).frames, before.frames);
    EXPECT_EQ(detector.floor(0).mean, before.mean);
}

TEST(Detector, WarmStartIsSettledFromTheFirstSampleAfterTheFilters) {
    auto first = Detector::make(quick_settings(), ripple_channels(2), rate);
    run_whole(first, test::white_noise(20 * 1250, 2, 20.0, 5), 2, 1000);
    std::vector<FloorState> floors;
    for (std::size_t i = 0; i < first.floor_count(); ++i) {
        const auto floor = first.floor(i);
        floors.push_back({floor.mean, floor.deviation, floor.frames});
    }
    auto second = Detector::make(quick_settings(), ripple_channels(2), rate);
    second.warm_start(floors);
    EXPECT_TRUE(second.settled());
    EXPECT_DOUBLE_EQ(second.floor(0).mean, first.floor(0).mean);
    EXPECT_THROW(second.warm_start({}), Refusal);
}

TEST(Detector, FlatSignalLeavesNoSubnormalNumbersThatWouldSlowTheLoop) {
    auto detector = Detector::make(quick_settings(), ripple_channels(1), rate);
    std::vector<float> data(60 * 1250, 0.0F);
    data[10] = 1000.0F;
    const auto watched = run_whole(detector, data, 1, 64, true);
    for (const auto& envelopes : watched.envelopes) {
        ASSERT_NE(std::fpclassify(envelopes.front()), FP_SUBNORMAL);
    }
}

TEST(Detector, RefusesSettingsThatContradictEachOther) {
    auto no_site = ripple_channels(1);
    no_site[0].role = ChannelRole::reference;
    EXPECT_THROW((void)Detector::make(quick_settings(), no_site, rate), Refusal);
    auto too_many = quick_settings();
    too_many.vote = {VoteRule::count, 3};
    EXPECT_THROW((void)Detector::make(too_many, ripple_channels(2), rate), Refusal);
    auto rearm_above = quick_settings();
    rearm_above.threshold.rearm_deviations = 9.0;
    EXPECT_THROW((void)Detector::make(rearm_above, ripple_channels(1), rate), Refusal);
}

} // namespace
} // namespace millpond
