#include "base/refusal.hpp"
#include "referee/envelope_rules.hpp"
#include "referee/invented_signal.hpp"
#include "referee/referee.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <numbers>

namespace millpond {
namespace {

using test::ask_scipy;
using test::Signal;

constexpr float missing = std::numeric_limits<float>::quiet_NaN();

// Noise alone crosses 5 SD about once a minute (referee_settings.hpp): a test of one ripple in noise asks for more.
RefereeSettings strict() {
    RefereeSettings settings;
    settings.peak_deviations = 8.0;
    settings.artefacts.exclude = false; // artefacts_test.cpp
    return settings;
}

RefereeFindings judge(const Signal& signal, const RefereeSettings& settings = strict()) {
    return find_ripples(settings, ripple_channels(signal.channels), signal.rate, signal.block());
}

std::vector<double> as_doubles(const std::vector<float>& values) {
    return {values.begin(), values.end()};
}

std::vector<float> energy_of(const Signal& signal, int order) {
    const auto band = butterworth_band_pass(Hertz{150.0}, Hertz{250.0}, order, signal.rate);
    ZeroPhaseBand filter(band, 1);
    std::vector<double> passed;
    for (const float value : signal.data) {
        const double frame[] = {static_cast<double>(value)};
        filter.add(frame, passed);
    }
    filter.end_run(passed);
    std::vector<float> energies;
    for (const double value : passed) {
        energies.push_back(static_cast<float>(value * value));
    }
    return energies;
}

class ZeroPhaseAgainstScipy : public testing::TestWithParam<std::pair<double, int>> {};

TEST_P(ZeroPhaseAgainstScipy, EqualsSosfiltfiltOfScipysOwnButterworthDesignFromEndToEnd) {
    MILLPOND_NEEDS_SCIPY();
    const auto [rate, order] = GetParam();
    Signal signal(Hertz{rate}, 1, rate > 10000.0 ? 1.0 : 8.0);
    signal.add_noise(40.0);
    signal.add_ripple(0.4, 150.0);
    const auto ours = energy_of(signal, order);
    // padtype None: first and last value stand for ever, as in zero_phase.hpp (scipy.signal.sosfiltfilt, SciPy 1.10).
    const auto theirs =
        ask_scipy("sos = signal.butter(" + std::to_string(order) + ", [150, 250], 'band', fs=" + std::to_string(rate) +
                      ", output='sos')\n" + "tell(signal.sosfiltfilt(sos, x, padtype=None)**2)",
                  as_doubles(signal.data));
    ASSERT_EQ(ours.size(), theirs.size());
    double peak = 0.0, worst = 0.0;
    for (std::size_t i = 0; i < theirs.size(); ++i) {
        peak = std::max(peak, theirs[i]);
        worst = std::max(worst, std::abs(static_cast<double>(ours[i]) - theirs[i]));
    }
    EXPECT_GT(peak, 1000.0);
    EXPECT_LT(worst / peak, 1e-6); // the energies are floats
}
INSTANTIATE_TEST_SUITE_P(RatesAndOrders, ZeroPhaseAgainstScipy,
                         testing::Values(std::pair{1250.0, 1}, std::pair{1250.0, 3}, std::pair{1250.0, 4},
                                         std::pair{30000.0, 3}, std::pair{30000.0, 8}));

TEST(GaussianSmoothing, EqualsScipysGaussianFilterRenormalisedAtTheEnds) {
    MILLPOND_NEEDS_SCIPY();
    Signal signal(Hertz{1250.0}, 1, 8.0); // longer than one block of the smoother
    signal.add_noise(1.0);
    auto ours = signal.data;
    smooth_gaussian(ours, 5.3);
    const auto theirs = ask_scipy("g = lambda v: ndimage.gaussian_filter1d(v, 5.3, mode='constant')\n"
                                  "tell(g(x) / g(np.ones_like(x)))",
                                  as_doubles(signal.data));
    ASSERT_EQ(ours.size(), theirs.size());
    for (std::size_t i = 0; i < theirs.size(); ++i) {
        ASSERT_NEAR(static_cast<double>(ours[i]), theirs[i], 2e-6) << i;
    }
}

TEST(RefereeEnvelope, IsTheSmoothedAnalyticEnvelopeOfScipysHilbert) {
    MILLPOND_NEEDS_SCIPY();
    Signal signal(Hertz{1250.0}, 1, 10.0);
    signal.add_noise(20.0);
    signal.add_ripple(5.0, 150.0);
    auto referee = Referee::make({}, ripple_channels(1), signal.rate);
    referee.add(signal.block());
    static_cast<void>(referee.finish());
    const auto theirs = ask_scipy("sos = signal.butter(3, [150, 250], 'band', fs=1250, output='sos')\n"
                                  "a = np.abs(signal.hilbert(signal.sosfiltfilt(sos, x, padtype=None)))\n"
                                  "tell(np.sqrt(ndimage.gaussian_filter1d(a**2, 5.0)))",
                                  as_doubles(signal.data));
    for (std::size_t i = 500; i + 500 < theirs.size(); ++i) { // Hilbert by FFT wraps round at the ends
        ASSERT_NEAR(static_cast<double>(referee.envelope()[i]), theirs[i], 0.005 * theirs[i] + 0.05) << i;
    }
}

TEST(RefereeEnvelope, OfASineOnEverySiteIsItsAmplitude) {
    Signal signal(Hertz{1250.0}, 3, 4.0);
    for (std::size_t f = 0; f < signal.data.size() / 3; ++f) {
        const double t = static_cast<double>(f) / 1250.0;
        for (std::size_t c = 0; c < 3; ++c) {
            signal.data[f * 3 + c] = static_cast<float>(160.0 * std::sin(2.0 * std::numbers::pi * 193.6 * t));
        }
    }
    auto referee = Referee::make({}, ripple_channels(3), signal.rate);
    referee.add(signal.block());
    static_cast<void>(referee.finish());
    EXPECT_NEAR(static_cast<double>(referee.envelope()[2500]), 160.0, 0.5);
}

TEST(Referee, FindsARippleWhereItIsWithItsPeakInItsMiddle) {
    Signal signal(Hertz{1250.0}, 4, 30.0);
    signal.add_noise(10.0);
    signal.add_ripple(12.0, 150.0);
    signal.add_ripple(20.0, 150.0);
    const auto found = judge(signal);
    ASSERT_EQ(found.ripples.size(), 2U);
    EXPECT_NEAR(seconds_at(found.ripples[0].peak, signal.rate), 12.0, 0.004);
    EXPECT_NEAR(seconds_at(found.ripples[1].peak, signal.rate), 20.0, 0.004);
    EXPECT_LT(found.ripples[0].onset, found.ripples[0].peak);
    EXPECT_GT(found.ripples[0].end, found.ripples[0].peak);
    EXPECT_NEAR(found.ripples[0].peak_envelope, 150.0, 15.0);
}

TEST(Referee, FindsTheSameAt30KilohertzAsAt1250) {
    Signal slow(Hertz{1250.0}, 1, 20.0), fast(Hertz{30000.0}, 1, 20.0);
    for (auto* signal : {&slow, &fast}) {
        signal->add_noise(signal == &slow ? 10.0 : 10.0 * std::sqrt(24.0)); // the same density in the band
        signal->add_ripple(9.0, 200.0);
    }
    const auto at_slow = judge(slow), at_fast = judge(fast);
    ASSERT_EQ(at_slow.ripples.size(), 1U);
    ASSERT_EQ(at_fast.ripples.size(), 1U);
    EXPECT_NEAR(seconds_at(at_fast.ripples[0].peak, fast.rate), seconds_at(at_slow.ripples[0].peak, slow.rate), 0.004);
    EXPECT_NEAR(at_fast.floor / at_slow.floor, 1.0, 0.1);
}

TEST(Referee, GivesTheSameWhetherTheRecordingComesWholeOrInPieces) {
    Signal signal(Hertz{1250.0}, 2, 30.0);
    signal.add_noise(10.0);
    signal.add_ripple(15.0, 150.0);
    const auto whole = judge(signal);
    auto referee = Referee::make(strict(), ripple_channels(2), signal.rate);
    const auto block = signal.block();
    for (std::size_t at = 0; at < block.frames(); at += 37) {
        referee.add(block.part(at, std::min<std::size_t>(37, block.frames() - at)));
    }
    EXPECT_EQ(referee.finish().ripples, whole.ripples);
}

TEST(Referee, LetsNoRippleCrossMissingFrames) {
    Signal signal(Hertz{1250.0}, 1, 20.0);
    signal.add_noise(10.0);
    signal.add_ripple(10.0, 200.0, 40.0);
    ASSERT_EQ(judge(signal).ripples.size(), 1U);
    const std::size_t hole = 12500;
    signal.data[hole] = missing;
    const auto found = judge(signal);
    ASSERT_EQ(found.ripples.size(), 2U);
    EXPECT_LT(found.ripples[0].end.value, hole);
    EXPECT_GT(found.ripples[1].onset.value, hole);
}

TEST(Referee, KeepsPlacesTrueAcrossFramesLeftOutBetweenBlocks) {
    Signal signal(Hertz{1250.0}, 1, 20.0);
    signal.add_noise(10.0);
    signal.add_ripple(15.0, 150.0);
    auto referee = Referee::make(strict(), ripple_channels(1), signal.rate);
    const auto block = signal.block();
    referee.add(block.part(0, 5000));
    referee.add(block.part(6000, block.frames() - 6000));
    const auto found = referee.finish();
    ASSERT_EQ(found.ripples.size(), 1U);
    EXPECT_NEAR(seconds_at(found.ripples[0].peak, signal.rate), 15.0, 0.004);
    EXPECT_EQ(found.frames_judged, block.frames() - 1000);
    EXPECT_TRUE(std::isnan(referee.envelope()[5500]));
}

TEST(Referee, TakesNothingFromMissingFramesIntoItsStatistics) {
    Signal signal(Hertz{1250.0}, 1, 60.0);
    signal.add_noise(10.0);
    const auto before = judge(signal);
    for (std::size_t i = 20000; i < 20500; ++i) {
        signal.data[i] = missing;
    }
    const auto after = judge(signal);
    EXPECT_NEAR(after.floor / before.floor, 1.0, 0.01);
    EXPECT_EQ(after.frames_judged, before.frames_judged - 500);
}

TEST(Referee, LooksAtRippleSitesOnly) {
    Signal signal(Hertz{1250.0}, 3, 20.0);
    signal.add_noise(10.0);
    signal.add_ripple(10.0, 150.0, 20.0, 1); // on channels 1 and 2
    auto channels = ripple_channels(3);
    channels[1].role = ChannelRole::reference;
    channels[2].role = ChannelRole::unused;
    EXPECT_TRUE(find_ripples(strict(), channels, signal.rate, signal.block()).ripples.empty());
    channels[2].role = ChannelRole::ripple;
    EXPECT_EQ(find_ripples(strict(), channels, signal.rate, signal.block()).ripples.size(), 1U);
}

TEST(Referee, IgnoresWhatIsMissingOnAnUnusedChannel) {
    Signal signal(Hertz{1250.0}, 2, 20.0);
    signal.add_noise(10.0);
    signal.data[10001] = missing;
    auto channels = ripple_channels(2);
    channels[1].role = ChannelRole::unused;
    EXPECT_EQ(find_ripples(strict(), channels, signal.rate, signal.block()).frames_judged, 25000U);
}

TEST(Referee, FloorIsMovedFarLessByTheRipplesThanWithoutClipping) {
    Signal quiet(Hertz{1250.0}, 1, 60.0), busy(Hertz{1250.0}, 1, 60.0);
    quiet.add_noise(10.0);
    busy.add_noise(10.0);
    for (int i = 1; i < 40; ++i) {
        busy.add_ripple(1.5 * i, 200.0);
    }
    auto unclipped = strict();
    unclipped.clip_deviations = 0.0;
    EXPECT_GT(judge(busy, unclipped).spread, 4.0 * judge(quiet).spread);
    EXPECT_LT(judge(busy).spread, 2.0 * judge(quiet).spread);
    EXPECT_EQ(judge(busy).ripples.size(), 39U);
}

TEST(Referee, FindsNothingInSilence) {
    EXPECT_TRUE(judge(Signal(Hertz{1250.0}, 1, 5.0)).ripples.empty());
}

// One run of an envelope whose floor is 0 with SD 1: peak at 5, edges at 1, rate 1000 Hz, so a frame is 1 ms.
Ripples pick(const std::vector<float>& envelope, const RefereeSettings& settings = {}) {
    return pick_ripples(envelope, SampleIndex{100}, {0.0, 1.0, envelope.size()}, settings, Hertz{1000.0});
}

std::vector<float> hills(std::initializer_list<std::pair<int, float>> stretches) {
    std::vector<float> envelope;
    for (const auto& [frames, height] : stretches) {
        envelope.insert(envelope.end(), static_cast<std::size_t>(frames), height);
    }
    return envelope;
}

TEST(RefereeRule, EdgesLieAtTheLowerThresholdAndThePeakMustReachTheUpper) {
    const auto found = pick(hills({{20, 0.5F}, {10, 2.0F}, {10, 5.5F}, {10, 2.0F}, {20, 0.5F}}));
    ASSERT_EQ(found.size(), 1U);
    EXPECT_EQ(found[0], (Ripple{SampleIndex{120}, SampleIndex{130}, SampleIndex{149}, 5.5}));
    EXPECT_TRUE(pick(hills({{20, 0.5F}, {30, 4.9F}, {20, 0.5F}})).empty());
}

TEST(RefereeRule, EventsNearerThanTheMergeGapAreOneRipple) {
    EXPECT_EQ(pick(hills({{20, 6.0F}, {13, 0.5F}, {20, 7.0F}, {5, 0.0F}})).size(), 1U);
    EXPECT_EQ(pick(hills({{20, 6.0F}, {15, 0.5F}, {20, 7.0F}, {5, 0.0F}})).size(), 2U);
}

TEST(RefereeRule, MergedRippleKeepsTheHigherPeak) {
    const auto found = pick(hills({{20, 6.0F}, {5, 0.5F}, {20, 7.0F}, {5, 0.0F}}));
    ASSERT_EQ(found.size(), 1U);
    EXPECT_EQ(found[0], (Ripple{SampleIndex{100}, SampleIndex{125}, SampleIndex{144}, 7.0}));
}

TEST(RefereeRule, EventsShorterThanTheShortestDurationAreDroppedAfterMerging) {
    EXPECT_TRUE(pick(hills({{5, 0.0F}, {15, 6.0F}, {30, 0.0F}})).empty()); // 14 ms from first to last frame
    EXPECT_EQ(pick(hills({{5, 0.0F}, {16, 6.0F}, {30, 0.0F}})).size(), 1U);
    EXPECT_EQ(pick(hills({{5, 0.0F}, {8, 6.0F}, {5, 0.0F}, {8, 6.0F}, {30, 0.0F}})).size(), 1U);
}

TEST(RefereeSettings, ThatContradictEachOtherOrTheRateAreRefused) {
    const auto make = [](auto change) {
        RefereeSettings settings;
        change(settings);
        return Referee::make(settings, ripple_channels(1), Hertz{1250.0});
    };
    EXPECT_THROW(make([](auto& s) { s.high_hz = 625.0; }), Refusal);
    EXPECT_THROW(make([](auto& s) { s.low_hz = 260.0; }), Refusal);
    EXPECT_THROW(make([](auto& s) { s.edge_deviations = 6.0; }), Refusal);
    EXPECT_THROW(make([](auto& s) { s.smoothing_ms = 1.0; }), Refusal);
    EXPECT_NO_THROW(make([](auto&) {}));
    auto none = ripple_channels(1);
    none[0].role = ChannelRole::unused;
    EXPECT_THROW(Referee::make({}, none, Hertz{1250.0}), Refusal);
}

} // namespace
} // namespace millpond
