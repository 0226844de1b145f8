#include "synth/all_frames.hpp"
#include "synth/answering_animal.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

SceneSettings bare_ripples() {
    SceneSettings settings;
    settings.sites = 1;
    settings.reference = true;
    settings.duration_s = 30.0;
    settings.quiet_start_s = 1.0;
    settings.background.rms_uv = settings.background.amplifier_uv = 0.0;
    settings.sharp_wave.amplitude_uv = 0.0;
    return settings;
}

struct Lived {
    std::vector<float> frames; ///< site, reference, site, ...
    std::vector<RippleTruth> truth;
};

Lived live_through(const SceneSettings& scene, const AnswerSettings& answer, std::vector<SampleIndex> pulses,
                   std::size_t block = 100) {
    auto animal = AnsweringAnimal::make(scene, answer);
    for (const auto at : pulses) {
        animal.pulse(at);
    }
    Lived lived;
    std::vector<float> frames(block * animal.channels().size());
    while (const auto made = animal.next(frames)) {
        lived.frames.insert(lived.frames.end(), frames.begin(),
                            frames.begin() + static_cast<std::ptrdiff_t>(made * animal.channels().size()));
    }
    lived.truth = animal.truth();
    return lived;
}

TEST(AnsweringAnimal, WithoutPulsesIsItsScene) {
    SceneSettings settings;
    settings.duration_s = 20.0;
    EXPECT_EQ(live_through(settings, {}, {}).frames, test::all_frames(Scene::make(settings)));
}

TEST(AnsweringAnimal, AnswersTheSameAtAnyBlockSize) {
    const std::vector<SampleIndex> pulses{{2000}, {2001}, {9000}};
    const auto whole = live_through(bare_ripples(), {}, pulses, 37'500);
    for (const std::size_t block : {1u, 7u, 64u}) {
        EXPECT_EQ(live_through(bare_ripples(), {}, pulses, block).frames, whole.frames);
    }
}

TEST(AnsweringAnimal, PulseLeavesABiphasicArtefactOnAllChannelsThatRecovers) {
    auto scene = bare_ripples();
    scene.ripples.rate_per_s = 0.0;
    const auto lived = live_through(scene, {}, {SampleIndex{100}}).frames;
    for (std::size_t frame = 0; frame < 300; ++frame) {
        ASSERT_EQ(lived[2 * frame], lived[2 * frame + 1]) << "reference as site";
    }
    EXPECT_EQ(lived[2 * 99], 0.0f);
    EXPECT_EQ(lived[2 * 100], 25000.0f) << "100 times the background's rms";
    EXPECT_EQ(lived[2 * 101], -25000.0f);
    EXPECT_NEAR(lived[2 * 102], -25000.0 * 0.3, 1.0);
    // Five ms are 6.25 frames: one time constant.
    EXPECT_NEAR(lived[2 * 127] / lived[2 * 102], std::exp(-4.0), 1e-3);
    EXPECT_LT(std::abs(lived[2 * 200]), 0.01f);
}

TEST(AnsweringAnimal, ArtefactsOfATrainAddUp) {
    auto scene = bare_ripples();
    scene.ripples.rate_per_s = 0.0;
    const auto one = live_through(scene, {}, {SampleIndex{100}}).frames;
    const auto other = live_through(scene, {}, {SampleIndex{105}}).frames;
    const auto both = live_through(scene, {}, {SampleIndex{100}, SampleIndex{105}}).frames;
    for (std::size_t i = 0; i < 1000; ++i) {
        ASSERT_NEAR(both[i], one[i] + other[i], 0.02f);
    }
}

TEST(AnsweringAnimal, PulseWithinARippleCutsItShort) {
    AnswerSettings answer;
    answer.artefact_uv = 0.0;
    const auto untouched = live_through(bare_ripples(), answer, {});
    ASSERT_GE(untouched.truth.size(), 5u);
    const auto& target = untouched.truth[2];
    const auto pulse = target.onset + (target.end - target.onset) / 3;
    const auto lived = live_through(bare_ripples(), answer, {pulse});
    ASSERT_EQ(lived.truth.size(), untouched.truth.size());
    const auto& cut = lived.truth[2];
    EXPECT_TRUE(cut.cut);
    EXPECT_EQ(cut.onset, target.onset) << "what was there before the pulse stays";
    EXPECT_LT(cut.end.value, target.end.value);
    // Silenced after 4 ms (5 frames), gone within another 5 ms (6.25 frames).
    EXPECT_GE(cut.end - pulse, 5u);
    EXPECT_LE(cut.end - pulse, 12u);
    EXPECT_LE(cut.peak, cut.end);
    for (std::size_t i = pulse.value + 12; i < target.end.value; ++i) {
        ASSERT_EQ(lived.frames[2 * i], 0.0f);
    }
    for (std::size_t i = 0; i < pulse.value + 5; ++i) {
        ASSERT_EQ(lived.frames[2 * i], untouched.frames[2 * i]);
    }
    for (std::size_t i = 3; i < lived.truth.size(); ++i) {
        EXPECT_EQ(lived.truth[i].onset, untouched.truth[i].onset) << "later ripples stay where they were";
        EXPECT_FALSE(lived.truth[i].cut);
    }
}

TEST(AnsweringAnimal, PulseBetweenRipplesCutsNone) {
    const auto untouched = live_through(bare_ripples(), {}, {});
    const auto between = untouched.truth[1].end + 10;
    for (const auto& ripple : live_through(bare_ripples(), {}, {between}).truth) {
        EXPECT_FALSE(ripple.cut);
    }
}

TEST(AnsweringAnimal, PulseThatIsLateActsInTheNextFrame) {
    auto scene = bare_ripples();
    scene.ripples.rate_per_s = 0.0;
    auto animal = AnsweringAnimal::make(scene, {});
    std::vector<float> frames(2 * 50);
    animal.next(frames);
    animal.pulse(SampleIndex{10});
    animal.next(frames);
    EXPECT_EQ(frames[0], 25000.0f);
}

} // namespace
} // namespace millpond
