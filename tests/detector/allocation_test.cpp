// Nothing in the loop allocates, whatever is on. The one file of this program that includes the guard.
#include "detector/evidence_support.hpp"
#include "engine/engine.hpp"
#include "support/allocation_guard.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

struct Counted : EventSink, PulsePort {
    std::size_t sites = 0, gates = 0, detections = 0;
    void take(const Event& event) noexcept override {
        sites += event.kind == EventKind::site ? 1 : 0;
        gates += event.kind == EventKind::gate ? 1 : 0;
        detections += event.kind == EventKind::detection ? 1 : 0;
    }
    void fire(const Event& /*trigger*/) noexcept override {}
};

TEST(Allocation, EvidenceADyingSiteTheStateGateAndMainsRemovalAllocateNothingInTheLoop) {
    auto scene_settings = named_scene(SceneName::hard);
    scene_settings.duration_s = 150.0;
    scene_settings.faults.failing_site = 2;
    scene_settings.faults.failing_at_s = 60.0;
    auto scene = Scene::make(scene_settings);
    auto data = test::samples_of(scene);
    for (std::size_t i = 90 * 1250; i < 150 * 1250; ++i) {
        data[i * 5 + 1] = data[i * 5 + 2]; // well again
    }
    data[100 * 1250 * 5] = std::nanf("");
    auto settings = test::learned_evidence();
    settings.state_gate.on = true;
    settings.mains.method = MainsMethod::adaptive;
    Counted counted;
    Engine engine(Detector::make(settings, scene.channels(), scene.rate()), ArbiterSettings{}, {}, scene.rate(),
                  counted, counted);
    const test::AllocationGuard guard;
    engine.start(SampleIndex{0}, true);
    const FrameBlock whole{SampleIndex{0}, 5, data};
    for (std::size_t at = 0; at < whole.frames(); at += 7) {
        engine.process(whole.part(at, std::min<std::size_t>(7, whole.frames() - at)));
    }
    EXPECT_EQ(guard.allocations(), 0U);
    EXPECT_EQ(counted.sites, 2U);
    EXPECT_GT(counted.gates, 1U);
    EXPECT_GT(counted.detections, 10U);
}

} // namespace
} // namespace millpond
