// The whole textbook chain of the envelope detector against bench/scipy_textbook.py, which has its filters from SciPy
// and its rules written anew.
#include "support/files.hpp"
#include "support/python.hpp"
#include "support/textbook_json.hpp"
#include "synth/named_scenes.hpp"
#include "synth/scene.hpp"
#include "tuning/offline_engine.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

struct Recording {
    Channels channels;
    Hertz rate;
    std::vector<float> data;
};

Recording hard_scene(double seconds) {
    auto settings = named_scene(SceneName::hard);
    settings.duration_s = seconds;
    settings.seed = 31;
    auto scene = Scene::make(settings);
    Recording recording{scene.channels(), scene.rate(), std::vector<float>(scene.frames() * scene.channels().size())};
    scene.next(recording.data);
    return recording;
}

std::vector<std::uint64_t> by_scipy(const DetectorSettings& settings, const Recording& recording) {
    const test::TemporaryFolder folder;
    const auto frames = folder.file(
        "frames.f32", {reinterpret_cast<const char*>(recording.data.data()), recording.data.size() * sizeof(float)});
    const auto ran =
        test::run("/usr/bin/python3 " MILLPOND_SOURCE_DIR "/bench/scipy_textbook.py " + frames.string() + " " +
                  folder.file("settings.json", test::textbook_json(settings, recording.channels, recording.rate).dump())
                      .string());
    EXPECT_EQ(ran.status, 0) << ran.err;
    std::istringstream lines(ran.out);
    std::vector<std::uint64_t> found;
    for (std::uint64_t at = 0; lines >> at;) {
        found.push_back(at);
    }
    return found;
}

std::vector<std::uint64_t> by_engine(const DetectorSettings& settings, const Recording& recording) {
    auto engine = OfflineEngine::make({settings, {}}, recording.channels, recording.rate);
    engine.start(false); // not armed: no triggers, so nothing is blanked
    engine.process({SampleIndex{0}, recording.channels.size(), recording.data});
    engine.finish();
    std::vector<std::uint64_t> found;
    for (const auto at : detections_to_score(engine.events())) {
        found.push_back(at.value);
    }
    return found;
}

void expect_the_same(const DetectorSettings& settings) {
    const auto recording = hard_scene(60.0);
    const auto theirs = by_scipy(settings, recording);
    EXPECT_GT(theirs.size(), 15U);
    EXPECT_EQ(by_engine(settings, recording), theirs);
}

TEST(TextbookChain, RectifiedMeanWithVetoCrossesWhereScipyDoes) {
    MILLPOND_NEEDS_SCIPY();
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.filter.order = 2;
    settings.envelope = {EnvelopeMethod::rectify, 6.0};
    settings.threshold = {3.5, 1.75, 0.0};
    expect_the_same(settings);
}

TEST(TextbookChain, AnalyticCountOfSitesCrossesWhereScipyDoes) {
    MILLPOND_NEEDS_SCIPY();
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.filter.low_hz = 140.0;
    settings.envelope = {EnvelopeMethod::analytic, 4.0};
    settings.vote = {VoteRule::count, 2};
    settings.veto.deviations = 3.0;
    settings.threshold = {3.5, 1.75, 0.0};
    expect_the_same(settings);
}

} // namespace
} // namespace millpond
