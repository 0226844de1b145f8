// Sites that die: noticed, left out, journaled, taken in again, while ripples go on being found.
#include "base/refusal.hpp"
#include "detector/evidence_calibration.hpp"
#include "detector/evidence_support.hpp"
#include "detector/site_mix.hpp"
#include "engine/engine.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>

namespace millpond {
namespace {

std::vector<std::pair<const char*, DetectorSettings>> both() {
    return {{"default", test::default_evidence()}, {"learned", test::learned_evidence()}};
}

Channels five_channels() {
    auto channels = ripple_channels(5);
    channels[4].role = ChannelRole::reference;
    return channels;
}

SceneSettings four_sites(double seconds) {
    auto scene = named_scene(SceneName::quiet);
    scene.duration_s = seconds;
    scene.seed = 5;
    return scene;
}

TEST(SiteLoss, ASiteThatFailsMidwayIsLeftOutAndRipplesGoOnBeingFound) {
    for (const auto& [name, settings] : both()) {
        const double healthy = test::try_detector(four_sites(300.0), settings, 65.0).hit_rate();
        EXPECT_GT(healthy, 0.8) << name;
        for (const auto kind : {FaultKind::flat, FaultKind::railed, FaultKind::huge}) {
            auto scene = four_sites(300.0);
            scene.faults.failing_site = 2;
            scene.faults.failing_kind = kind;
            scene.faults.failing_at_s = 60.0;
            scene.faults.huge_uv = 5000.0;
            const auto trial = test::try_detector(scene, settings, 65.0);
            ASSERT_EQ(trial.sites.size(), 1U) << name;
            EXPECT_EQ(trial.sites[0].channel, 1U);
            EXPECT_EQ(trial.sites[0].state, kind == FaultKind::huge ? SiteState::huge : SiteState::flat);
            EXPECT_GT(trial.hit_rate(), healthy - 0.15) << name << " " << static_cast<int>(kind);
            EXPECT_LT(trial.falses, 16U) << name << " " << static_cast<int>(kind);
        }
    }
}

TEST(SiteLoss, WithoutTheWatchAHugeSiteHidesNearlyAllRipples) {
    auto scene = four_sites(200.0);
    scene.faults.failing_site = 2;
    scene.faults.failing_kind = FaultKind::huge;
    scene.faults.failing_at_s = 60.0;
    scene.faults.huge_uv = 5000.0;
    auto settings = test::default_evidence();
    settings.evidence.site_watch.on = false;
    EXPECT_LT(test::try_detector(scene, settings, 65.0).hit_rate(), 0.2);
}

struct Kept : EventSink, PulsePort {
    std::vector<Event> events;
    void take(const Event& event) noexcept override { events.push_back(event); }
    void fire(const Event& /*trigger*/) noexcept override {}
};

/// Site 2 shows nothing from 40 s to 60 s.
const std::vector<float>& flat_for_a_while() {
    static const auto data = [] {
        auto scene = Scene::make(four_sites(90.0));
        auto samples = test::samples_of(scene);
        for (std::size_t i = 40 * 1250; i < 60 * 1250; ++i) {
            samples[i * 5 + 1] = 12.0F;
        }
        return samples;
    }();
    return data;
}

std::vector<Event> events_of(const DetectorSettings& detector, std::size_t block, KernelWidth width) {
    auto scene = Scene::make(four_sites(1.0));
    Kept kept;
    Engine engine(Detector::make(detector, scene.channels(), scene.rate(), width), ArbiterSettings{}, {}, scene.rate(),
                  kept, kept);
    engine.start(SampleIndex{0}, true);
    const FrameBlock whole{SampleIndex{0}, 5, flat_for_a_while()};
    for (std::size_t at = 0; at < whole.frames(); at += block) {
        engine.process(whole.part(at, std::min(block, whole.frames() - at)));
    }
    return kept.events;
}

TEST(SiteLoss, IsJournaledAtItsPlaceAndTheReturnTenSecondsAfterItIsWell) {
    std::vector<Event> sites;
    for (const auto& event : events_of(test::default_evidence(), 1000, KernelWidth::automatic)) {
        if (event.kind == EventKind::site) {
            sites.push_back(event);
        }
    }
    ASSERT_EQ(sites.size(), 2U);
    EXPECT_EQ(sites[0].code, static_cast<std::uint8_t>(SiteState::flat));
    EXPECT_EQ(sites[0].as<SiteDetail>().channel, 1U);
    EXPECT_NEAR(seconds_at(sites[0].sample, Hertz{1250.0}), 41.5, 0.6);
    EXPECT_EQ(sites[1].code, static_cast<std::uint8_t>(SiteState::alive));
    EXPECT_NEAR(seconds_at(sites[1].sample, Hertz{1250.0}), 70.5, 0.6);
}

TEST(SiteLoss, SameEventsAtAllPacketSizesAndVectorWidths) {
    for (const auto& [name, settings] : both()) {
        const auto expected = events_of(settings, 1, KernelWidth::automatic);
        EXPECT_GT(expected.size(), 100U);
        for (const std::size_t block : {7U, 64U, 1000U}) {
            EXPECT_TRUE(events_of(settings, block, KernelWidth::automatic) == expected) << name << " " << block;
        }
        const auto widest = Detector::make(settings, five_channels(), Hertz{1250.0}).width();
        for (const auto width : {KernelWidth::sse2, KernelWidth::avx2, KernelWidth::avx512}) {
            EXPECT_TRUE(width > widest || events_of(settings, 64, width) == expected)
                << name << " " << static_cast<int>(width);
        }
    }
}

TEST(SiteMix, WeightsWithoutALostChannelAreThoseOfNumPysSolve) {
    MILLPOND_NEEDS_SCIPY();
    const auto settings = test::learned_evidence();
    const std::vector<ChannelRole> inputs{ChannelRole::ripple, ChannelRole::ripple, ChannelRole::ripple,
                                          ChannelRole::ripple, ChannelRole::reference};
    auto mixes = SiteMixes::make(settings.evidence, inputs, "test");
    std::vector<double> x = settings.evidence.background; // 15 numbers, then pattern, then weights as given
    x.insert(x.end(), settings.evidence.mixes[0].pattern.begin(), settings.evidence.mixes[0].pattern.end());
    x.insert(x.end(), settings.evidence.mixes[0].weights.begin(), settings.evidence.mixes[0].weights.end());
    const auto expected = test::ask_scipy("C = np.zeros((5, 5)); C[np.tril_indices(5)] = x[:15]\n"
                                          "C = np.tril(C) + np.tril(C, -1).T; a = x[15:20]; w = x[20:]\n"
                                          "for lost in range(5):\n"
                                          "    k = [i for i in range(5) if i != lost]\n"
                                          "    v = np.zeros(5); K = C[np.ix_(k, k)]\n"
                                          "    s = np.linalg.solve(K, a[k])\n"
                                          "    v[k] = s * np.sqrt((w @ C @ w) / (s @ K @ s))\n"
                                          "    tell(v)",
                                          x);
    ASSERT_EQ(expected.size(), 25U);
    for (std::size_t lost = 0; lost < 5; ++lost) {
        std::vector<bool> alive(5, true);
        alive[lost] = false;
        std::vector<double> weights(5);
        mixes.weights(mixes.place_of("learned"), alive, weights.data());
        for (std::size_t i = 0; i < 5; ++i) {
            const double right = expected[5 * lost + i];
            EXPECT_NEAR(weights[i], right, 1e-9 * (std::abs(right) + 1.0)) << lost << " " << i;
        }
    }
}

TEST(SiteMix, WithoutABackgroundTheOtherWeightsStay) {
    auto settings = test::learned_evidence();
    settings.evidence.background.clear();
    auto mixes = SiteMixes::make(settings.evidence, std::vector<ChannelRole>(5, ChannelRole::ripple), "test");
    std::vector<double> weights(5);
    mixes.weights(mixes.place_of("learned"), {true, false, true, true, true}, weights.data());
    EXPECT_EQ(weights, (std::vector<double>{0.25, 0.0, 0.25, 0.25, 0.0}));
}

TEST(Calibration, TheThresholdLiesOnTheLogarithmOfTheRateBetweenTwoPoints) {
    EvidenceSettings evidence;
    evidence.calibration = {{4.0, 100.0}, {6.0, 1.0}, {7.0, 0.1}};
    const auto threshold = [&](double per_minute) {
        evidence.false_per_minute = per_minute;
        return threshold_for(evidence, "test");
    };
    EXPECT_DOUBLE_EQ(threshold(1.0), 6.0);
    EXPECT_DOUBLE_EQ(threshold(10.0), 5.0); // half way down a factor of a hundred
    EXPECT_DOUBLE_EQ(threshold(0.1), 7.0);
    EXPECT_DOUBLE_EQ(threshold(0.01), 8.0);   // beyond the last point it goes on as between the last two
    EXPECT_DOUBLE_EQ(threshold(1000.0), 3.0); // and before the first as between the first two
}

std::string refusal(const DetectorSettings& settings) {
    try {
        static_cast<void>(
            Detector::make(settings, five_channels(), Hertz{1250.0}, KernelWidth::automatic, "rig.yaml: detector"));
    } catch (const Refusal& found) {
        return found.what();
    }
    return "no refusal";
}

TEST(Evidence, SettingsThatContradictEachOtherAreRefusedWithFileAndKey) {
    const auto says = [](const std::function<void(EvidenceSettings&)>& spoil, const std::string& key) {
        auto settings = test::learned_evidence();
        spoil(settings.evidence);
        const auto text = refusal(settings);
        EXPECT_NE(text.find("rig.yaml: detector.evidence." + key), std::string::npos) << text;
    };
    says([](auto& e) { e.calibration.resize(1); }, "calibration");
    says([](auto& e) { std::swap(e.calibration[0], e.calibration[1]); }, "calibration[1]");
    says([](auto& e) { e.calibration[1].per_minute = e.calibration[0].per_minute; }, "calibration[1]");
    says([](auto& e) { e.features[0].mix = "nowhere"; }, "features[0].mix");
    says([](auto& e) { e.features[1].low_hz = e.features[1].high_hz; }, "features[1]");
    says([](auto& e) { e.features[0].low_hz = 700.0, e.features[0].high_hz = 900.0; }, "features[0]");
    says([](auto& e) { e.features.clear(); }, "features");
    says(
        [](auto& e) {
            for (auto& feature : e.features) {
                feature.weight = -1.0;
            }
        },
        "features");
    says([](auto& e) { e.mixes[0].weights.pop_back(); }, "mixes[0].weights");
    says([](auto& e) { e.mixes[0].pattern.pop_back(); }, "mixes[0].pattern");
    says([](auto& e) { e.mixes[0].name = "sites"; }, "mixes[0].name");
    says([](auto& e) { e.mixes.push_back(e.mixes[0]); }, "mixes[1].name");
    says([](auto& e) { e.background.pop_back(); }, "background");
    EXPECT_EQ(refusal(test::learned_evidence()), "no refusal");
}

} // namespace
} // namespace millpond
