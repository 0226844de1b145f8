// What is no ripple and must not be taken for one; ripples go on being found around it.
#include "detector/evidence_support.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <functional>
#include <numbers>

namespace millpond {
namespace {

constexpr std::size_t channels = 5; // four sites and a reference
constexpr double rate_hz = 1250.0;
constexpr std::size_t first_at = 25 * 1250, distance = 2 * 1250, artefacts = 25;

using Draw = std::function<void(std::vector<float>& data, std::size_t at, std::size_t number)>;

std::vector<std::uint64_t> detections_in(const std::vector<float>& data, const DetectorSettings& settings) {
    auto scene = Scene::make(test::quiet_without_ripples(7, 1.0));
    auto detector = Detector::make(settings, scene.channels(), Hertz{rate_hz});
    detector.gap(SampleIndex{0});
    std::vector<std::uint64_t> found;
    for (FrameBlock rest = test::block_of(data, channels); rest.frames() > 0;) {
        std::optional<Crossing> crossing;
        const auto used = detector.run(rest, crossing);
        if (crossing && !crossing->settling && !crossing->unsettled && !crossing->vetoed) {
            found.push_back(crossing->at.value);
        }
        rest = rest.part(used, rest.frames() - used);
    }
    return found;
}

const std::vector<float>& background() {
    static const auto data = [] {
        auto scene = Scene::make(test::quiet_without_ripples(7, 80.0));
        return test::samples_of(scene);
    }();
    return data;
}

// Artefacts after which a detection came within 150 ms.
std::size_t answered(const DetectorSettings& settings, const Draw& draw) {
    auto data = background();
    for (std::size_t i = 0; i < artefacts; ++i) {
        draw(data, first_at + i * distance, i);
    }
    const auto found = detections_in(data, settings);
    std::size_t count = 0;
    for (std::size_t i = 0; i < artefacts; ++i) {
        const auto at = first_at + i * distance;
        count += std::any_of(found.begin(), found.end(), [&](auto place) { return place >= at && place < at + 188; });
    }
    return count;
}

std::vector<std::pair<const char*, DetectorSettings>> both() {
    static const std::vector<std::pair<const char*, DetectorSettings>> all{{"default", test::default_evidence()},
                                                                           {"learned", test::learned_evidence()}};
    return all;
}

void add(std::vector<float>& data, std::size_t frame, std::size_t channel, double uv) {
    data[frame * channels + channel] += static_cast<float>(uv);
}

void step(std::vector<float>& data, std::size_t at, std::size_t number, std::size_t from, std::size_t to, double size) {
    for (std::size_t i = 0; i < distance - 600; ++i) { // up, and slowly back
        for (std::size_t c = from; c < to; ++c) {
            add(data, at + i, c,
                size * (number % 2 == 0 ? 2500.0 : -2500.0) * std::exp(-static_cast<double>(i) / 375.0));
        }
    }
}

void ripple(std::vector<float>& data, std::size_t at, std::size_t /*number*/) {
    std::vector<float> one(data.size() / channels);
    test::add_burst(one, 1, at, 100, rate_hz, 170.0, 160.0);
    constexpr double gains[] = {0.49, 0.92, 0.92, 0.49, 0.0};
    for (std::size_t i = at; i < at + 100; ++i) {
        for (std::size_t c = 0; c < channels; ++c) {
            add(data, i, c, gains[c] * static_cast<double>(one[i]));
        }
    }
}

void muscle(std::vector<float>& data, std::size_t at, std::size_t number) {
    test::Noise noise(100 + number);
    for (std::size_t i = 0; i < 375; ++i) {
        const double outline = std::sin(std::numbers::pi * static_cast<double>(i) / 375.0);
        const double shared = noise.gaussian();
        for (std::size_t c = 0; c < channels; ++c) {
            add(data, at + i, c, 100.0 * outline * (0.95 * shared + 0.3 * noise.gaussian()));
        }
    }
}

void fast_gamma(std::vector<float>& data, std::size_t at, std::size_t /*number*/) {
    std::vector<float> one(data.size() / channels);
    test::add_burst(one, 1, at, 125, rate_hz, 115.0, 120.0);
    for (std::size_t i = at; i < at + 125; ++i) {
        for (std::size_t c = 0; c < 4; ++c) {
            add(data, i, c, static_cast<double>(one[i]));
        }
    }
}

TEST(Rejection, EveryRippleIsAnsweredElseTheRestProvesNothing) {
    for (const auto& [name, settings] : both()) {
        EXPECT_EQ(answered(settings, ripple), artefacts) << name;
        EXPECT_EQ(answered(settings, [](auto&, auto, auto) {}), 0U) << name;
    }
}

TEST(Rejection, AStepOfTenTimesTheSignalIsNotDetectedWhetherOnOneSiteOrOnAll) {
    for (const auto& [name, settings] : both()) {
        for (const double size : {0.5, 1.0, 2.0}) { // times 2500 uV, on a background of 250
            const auto all = [size](auto& data, auto at, auto number) { step(data, at, number, 0, 5, size); };
            const auto one = [size](auto& data, auto at, auto number) { step(data, at, number, 1, 2, size); };
            EXPECT_EQ(answered(settings, all), 0U) << name << " " << size;
            EXPECT_EQ(answered(settings, one), 0U) << name << " " << size;
        }
    }
}

TEST(Rejection, SingleLargeSpikesAreNotDetected) {
    for (const auto& [name, settings] : both()) {
        EXPECT_EQ(answered(settings, [](auto& data, auto at, auto n) { add(data, at, n % 4, -1500.0); }), 0U) << name;
        const auto longer = [](auto& data, auto at, auto n) {
            add(data, at, n % 4, -1500.0);
            add(data, at + 1, n % 4, 600.0);
            add(data, at + 2, n % 4, 300.0);
        };
        EXPECT_EQ(answered(settings, longer), 0U) << name;
    }
}

TEST(Rejection, AMuscleBurstOverAllChannelsIsNotDetected) {
    for (const auto& [name, settings] : both()) {
        EXPECT_LE(answered(settings, muscle), 1U) << name;
    }
}

TEST(Rejection, FastGammaAt115HertzIsNotDetected) {
    for (const auto& [name, settings] : both()) {
        EXPECT_EQ(answered(settings, fast_gamma), 0U) << name;
    }
}

TEST(Rejection, HumThatSetsInIsNotDetected) {
    for (const auto& [name, settings] : both()) {
        const auto hum = [](auto& data, auto at, auto) {
            for (std::size_t i = 0; i < 1250; ++i) {
                const double turns = 2.0 * std::numbers::pi * 50.0 * static_cast<double>(i) / rate_hz;
                for (std::size_t c = 0; c < channels; ++c) {
                    add(data, at + i, c, 100.0 * std::sin(turns) + 30.0 * std::sin(3.0 * turns));
                }
            }
        };
        EXPECT_LE(answered(settings, hum), 1U) << name;
    }
}

TEST(Rejection, TheTextbookChainFallsForSomeOfThese) {
    auto textbook = test::default_evidence();
    textbook.method = DetectionMethod::envelope;
    EXPECT_GT(answered(textbook, [](auto& data, auto at, auto n) { add(data, at, n % 4, -1500.0); }), 5U);
    EXPECT_GT(answered(textbook, fast_gamma), 3U);
}

} // namespace
} // namespace millpond
