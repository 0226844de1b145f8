// How ripples follow one another and how they differ: doublets, small ones, depths.
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::bare;
using test::live_through;

double ms(std::uint64_t frames) {
    return static_cast<double>(frames) / 1.25;
}

class Doublets : public ::testing::Test {
  protected:
    static void SetUpTestSuite() {
        auto settings = bare();
        settings.duration_s = 6000.0;
        settings.ripples.doublet_share = 0.25;
        // So short that the end of the first seldom decides.
        settings.ripples.duration_ms = 50.0;
        settings.ripples.duration_log_sd = 0.2;
        settings.ripples.min_gap_ms = 300.0;
        truth_ = live_through(settings).truth;
    }
    /// Whether ripple i + 1 follows ripple i within a doublet.
    static bool followed(std::size_t i) { return truth_[i + 1].onset - truth_[i].end < 375; }
    static std::vector<RippleTruth> truth_;
};
std::vector<RippleTruth> Doublets::truth_;

TEST_F(Doublets, AreTheShareAskedForAndTriplesAreItsSquare) {
    double twos = 0.0, threes = 0.0;
    for (std::size_t i = 0; i + 2 < truth_.size(); ++i) {
        twos += followed(i) ? 1.0 : 0.0;
        threes += followed(i) && followed(i + 1) ? 1.0 : 0.0;
    }
    const auto count = static_cast<double>(truth_.size());
    // Four binomial deviations.
    EXPECT_NEAR(twos / count, 0.25, 4.0 * std::sqrt(0.25 * 0.75 / count));
    EXPECT_NEAR(threes / count, 0.0625, 4.0 * std::sqrt(0.0625 * 0.9375 / count) + 0.01);
}

// 100-200 ms: from memory.
TEST_F(Doublets, BeginAHundredToTwoHundredMsAfterTheFirst) {
    for (std::size_t i = 0; i + 1 < truth_.size(); ++i) {
        if (followed(i)) {
            const double apart_ms = ms(truth_[i + 1].onset - truth_[i].onset);
            ASSERT_GE(apart_ms, 99.0);
            ASSERT_LE(apart_ms, 201.0);
        }
    }
}

TEST_F(Doublets, ChangeNothingAboutTheRateAskedFor) {
    const double expected = 0.5 * (6000.0 - 15.0);
    EXPECT_NEAR(static_cast<double>(truth_.size()), expected, 5.0 * std::sqrt(expected)) << "chains come together";
}

TEST(Ripples, OfADoubletNeverOverlap) {
    auto settings = bare();
    settings.duration_s = 2000.0;
    settings.ripples.doublet_share = 0.6;
    const auto truth = live_through(settings).truth;
    for (std::size_t i = 1; i < truth.size(); ++i) {
        ASSERT_GT(truth[i].onset, truth[i - 1].end);
        ASSERT_GE(ms(truth[i].onset - truth[i - 1].end), 18.0) << "20 ms, to the frame";
    }
}

TEST(Ripples, AreSmallInTheShareAskedFor) {
    auto settings = bare();
    settings.duration_s = 4000.0;
    settings.ripples.amplitude_log_sd = 0.0;
    settings.ripples.small_share = 0.3;
    settings.ripples.small_size = 0.4;
    const auto truth = live_through(settings).truth;
    double small = 0.0;
    for (const auto& ripple : truth) {
        const bool is_small = ripple.amplitude_uv < 100.0;
        ASSERT_NEAR(ripple.amplitude_uv, is_small ? 64.0 : 160.0, 1.0);
        small += is_small ? 1.0 : 0.0;
    }
    const auto count = static_cast<double>(truth.size());
    EXPECT_NEAR(small / count, 0.3, 4.0 * std::sqrt(0.21 / count));
}

TEST(Ripples, ThatAreSmallOrInDoubletsOrDeepChangeNoOthers) {
    auto plain = bare();
    auto small = plain;
    small.ripples.small_share = 0.3;
    small.ripples.depth_sd_um = 50.0;
    const auto a = live_through(plain).truth, b = live_through(small).truth;
    ASSERT_EQ(a.size(), b.size());
    for (std::size_t i = 0; i < a.size(); ++i) {
        EXPECT_EQ(a[i].onset, b[i].onset);
        EXPECT_EQ(a[i].end, b[i].end);
    }
}

TEST(Ripples, LieAtDepthsThatDifferAndTheTruthSaysTheLargestSite) {
    auto settings = bare();
    settings.sites = 9;
    settings.site_spacing_um = 40.0;
    settings.duration_s = 200.0;
    settings.ripples.amplitude_log_sd = 0.0;
    settings.ripples.depth_sd_um = 60.0;
    const auto lived = live_through(settings);
    std::vector<int> largest(9);
    for (const auto& ripple : lived.truth) {
        std::vector<float> peaks(9);
        for (auto at = ripple.onset.value; at <= ripple.end.value; ++at) {
            for (std::size_t i = 0; i < 9; ++i) {
                peaks[i] = std::max(peaks[i], std::abs(lived.frames[at * 9 + i]));
            }
        }
        const auto most = std::max_element(peaks.begin(), peaks.end());
        ++largest[static_cast<std::size_t>(most - peaks.begin())];
        // At 1250 Hz the largest sample may lie a quarter of a period, or 0.1 of the height, beside the peak.
        EXPECT_NEAR(*most / ripple.amplitude_uv, 0.95, 0.1);
    }
    EXPECT_GT(largest[4], largest[2]);
    EXPECT_GT(largest[2] + largest[6], 4);
}

} // namespace
} // namespace millpond
