// Learning the evidence: mix, weights, calibration, against SciPy and on scenes and seeds that nothing was tuned on.
#include "base/refusal.hpp"
#include "support/python.hpp"
#include "synth/named_scenes.hpp"
#include "synth/scene.hpp"
#include "tuning/learning.hpp"
#include "tuning/mix_learning.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

struct Recorded {
    Channels channels;
    std::vector<float> data;
    Ripples truth;

    explicit Recorded(SceneName name, std::uint64_t seed, double seconds) {
        auto settings = named_scene(name);
        settings.seed = seed;
        settings.duration_s = seconds;
        auto scene = Scene::make(settings);
        channels = scene.channels();
        data.resize(scene.frames() * channels.size());
        scene.next(data);
        for (const auto& ripple : scene.truth()) {
            truth.push_back({ripple.onset, ripple.peak, ripple.end, ripple.amplitude_uv});
        }
    }
    [[nodiscard]] TuningRecording tuning() const { return {channels, data, truth, {}}; }
};

LearningPlan plan_of(std::string_view mix) {
    LearningPlan plan;
    plan.sweep.rate = Hertz{1250.0};
    plan.features = usual_features(mix);
    return plan;
}

SweepResult figures_of(const Recorded& recorded, const DetectorSettings& detector) {
    const auto tuning = recorded.tuning();
    const std::vector candidates{detector};
    const std::vector<std::size_t> which{0};
    auto plan = plan_of(learned_mix).sweep;
    plan.block_s = static_cast<double>(recorded.data.size()); // one block: all of it is in the training part
    return *confirm(std::span(&tuning, 1), candidates, which, plan)[0];
}

// scipy.linalg.eigh solves the same generalised eigenproblem from the same samples, filtered by scipy.signal.butter.
TEST(MixLearning, FindsTheLeadingGeneralisedEigenvectorThatSciPyFinds) {
    MILLPOND_NEEDS_SCIPY();
    const Recorded recorded(SceneName::quiet, 31, 60.0);
    const auto tuning = recorded.tuning();
    const Intervals all{{SampleIndex{0}, SampleIndex{tuning.frames()}}};
    const auto learned = learn_mix(std::span(&tuning, 1), std::span(&all, 1), Hertz{1250.0}, 0.01);
    std::string places;
    for (const auto& ripple : recorded.truth) {
        places += std::to_string(ripple.onset.value) + " " + std::to_string(ripple.end.value) + " ";
    }
    const auto expected = test::ask_scipy(R"(
from scipy.linalg import eigh
b, a = signal.butter(1, [150, 250], 'bandpass', fs=1250)
y = signal.lfilter(b, a, x, axis=0)
spans = np.array(sys.argv[2:], int).reshape(-1, 2)
side = np.ones(len(y), int)
for onset, end in spans: side[max(0, onset - 63):end + 64] = 0
for onset, end in spans: side[onset:end + 1] = 2
side[:100] = 0
rest, ripple = y[side == 1], y[side == 2]
C = rest.T @ rest / len(rest)
C = 0.99 * C + 0.01 * np.trace(C) / len(C) * np.eye(len(C))
w = eigh(ripple.T @ ripple / len(ripple), C)[1][:, -1]
a = C @ w
w = w * np.sign(a[np.argmax(abs(a))])
tell(w / np.linalg.norm(w)))",
                                          recorded.data, recorded.channels.size(), places);
    ASSERT_EQ(learned.weights.size(), expected.size());
    double norm = 0.0;
    for (const double weight : learned.weights) {
        norm += weight * weight;
    }
    for (std::size_t i = 0; i < expected.size(); ++i) {
        EXPECT_NEAR(learned.weights[i] / std::sqrt(norm), expected[i], 0.01) << i;
    }
    EXPECT_GT(learned.gain, 2.0 * learned.mean_gain) << "a mix with the reference beats the plain mean by far here";
}

TEST(MixLearning, RefusesRecordingsOfOtherChannels) {
    const Recorded five(SceneName::quiet, 31, 30.0), one(SceneName::running, 31, 30.0);
    const std::vector tuning{five.tuning(), one.tuning()};
    const std::vector<Intervals> all(2, Intervals{{SampleIndex{0}, SampleIndex{10'000}}});
    EXPECT_THROW(static_cast<void>(learn_mix(tuning, all, Hertz{1250.0}, 0.01)), Refusal);
}

TEST(Learning, FindsFarMoreOfAHardSceneThanTheOneBandDetectorAtNoMoreFalseDetections) {
    const Recorded recorded(SceneName::hard, 32, 600.0), fresh(SceneName::hard, 33, 600.0);
    const auto tuning = recorded.tuning();
    auto plan = plan_of(learned_mix);
    plan.false_per_minute = 0.5;
    const auto learned = learn_evidence(std::span(&tuning, 1), {}, plan);
    const auto ours = figures_of(fresh, learned.detector).training;
    DetectorSettings one_band;
    one_band.method = DetectionMethod::envelope;
    const auto theirs = figures_of(fresh, one_band).training;
    EXPECT_GE(ours.hit_rate().share, theirs.hit_rate().share + 0.15);
    EXPECT_LE(ours.false_per_minute, theirs.false_per_minute);
}

TEST(Learning, GivesAboutTheFalseDetectionsThatWereAskedFor) {
    const Recorded recorded(SceneName::typical, 34, 900.0), fresh(SceneName::typical, 35, 600.0);
    const auto tuning = recorded.tuning();
    auto plan = plan_of(learned_mix);
    for (const double asked : {2.0, 10.0}) {
        plan.false_per_minute = asked;
        const auto learned = learn_evidence(std::span(&tuning, 1), {}, plan);
        const auto got = figures_of(fresh, learned.detector).training;
        // Three deviations of a Poisson count (from memory), and a factor of 1.5 for another brain state and seed.
        const double expected = asked * got.eligible_minutes, room = 3.0 * std::sqrt(expected);
        EXPECT_LT(static_cast<double>(got.false_detections), 1.5 * expected + room) << asked;
        EXPECT_GT(static_cast<double>(got.false_detections), expected / 1.5 - room) << asked;
    }
}

TEST(Learning, OnThePlainMeanServesAnyNumberOfSites) {
    const Recorded recorded(SceneName::quiet, 36, 240.0), single(SceneName::running, 37, 120.0);
    const auto tuning = recorded.tuning();
    const auto learned = learn_evidence(std::span(&tuning, 1), {}, plan_of(sites_mix));
    EXPECT_TRUE(learned.detector.evidence.mixes.empty());
    EXPECT_GT(figures_of(single, learned.detector).training.hits, 5U);
}

TEST(Learning, RefusesRecordingsWithoutRipples) {
    const Recorded recorded(SceneName::quiet, 38, 60.0);
    auto tuning = recorded.tuning();
    tuning.truth.clear();
    EXPECT_THROW(static_cast<void>(learn_evidence(std::span(&tuning, 1), {}, plan_of(learned_mix))), Refusal);
    EXPECT_THROW(static_cast<void>(learn_evidence(std::span(&tuning, 1), {}, plan_of(sites_mix))), Refusal);
}

// Missing samples are neither ripple nor background: what is learned with some of them is nearly what it was.
TEST(Learning, TakesNothingFromMissingSamples) {
    const Recorded whole(SceneName::quiet, 39, 240.0);
    auto holed = whole;
    for (std::size_t f = 20'000; f < 20'500; ++f) {
        for (std::size_t c = 0; c < holed.channels.size(); ++c) {
            holed.data[f * holed.channels.size() + c] = std::numeric_limits<float>::quiet_NaN();
        }
    }
    const auto a = whole.tuning(), b = holed.tuning();
    const auto mix_of = [](const TuningRecording& tuning) {
        return learn_evidence(std::span(&tuning, 1), {}, plan_of(learned_mix)).detector.evidence.mixes[0].weights;
    };
    const auto left = mix_of(a), right = mix_of(b);
    for (std::size_t i = 0; i < left.size(); ++i) {
        EXPECT_NEAR(left[i], right[i], 0.05) << i;
    }
}

} // namespace
} // namespace millpond
