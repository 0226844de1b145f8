// The gate that follows the animal's state, on its own and through the engine.
#include "base/random.hpp"
#include "base/refusal.hpp"
#include "engine/engine.hpp"
#include "synth/named_scenes.hpp"
#include "synth/scene.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

namespace millpond {
namespace {

struct Kept : EventSink, PulsePort {
    std::vector<Event> events;
    void take(const Event& event) noexcept override { events.push_back(event); }
    void fire(const Event& /*trigger*/) noexcept override {}
    [[nodiscard]] std::vector<Event> of(EventKind kind) const {
        std::vector<Event> found;
        std::copy_if(events.begin(), events.end(), std::back_inserter(found),
                     [kind](const auto& event) { return event.kind == kind; });
        return found;
    }
};

struct Recording {
    Channels channels;
    Hertz rate;
    std::vector<float> data;
    std::vector<Happening> happenings;

    [[nodiscard]] std::size_t frames() const { return data.size() / channels.size(); }
    [[nodiscard]] FrameBlock part(std::size_t from, std::size_t to) const {
        return {SampleIndex{from}, channels.size(),
                std::span(data).subspan(from * channels.size(), (to - from) * channels.size())};
    }
};

Recording record(const SceneSettings& settings) {
    auto scene = Scene::make(settings);
    Recording recording{scene.channels(), scene.rate(), {}, {}};
    recording.data.resize(scene.frames() * scene.channels().size());
    scene.next(recording.data);
    recording.happenings = scene.happenings();
    return recording;
}

const Recording& hard_scene() {
    static const Recording recording = [] {
        auto settings = named_scene(SceneName::hard);
        settings.duration_s = 600.0;
        settings.seed = 4711;
        return record(settings);
    }();
    return recording;
}

EngineSettings gated() {
    EngineSettings settings;
    settings.detector.state_gate.on = true;
    settings.arbiter.start_armed = true;
    return settings;
}

Kept run(const Recording& recording, const EngineSettings& settings, std::size_t block,
         KernelWidth width = KernelWidth::automatic) {
    Kept kept;
    Engine engine(Detector::make(settings.detector, recording.channels, recording.rate, width), settings.arbiter, {},
                  recording.rate, kept, kept);
    engine.start(SampleIndex{0}, settings.arbiter.start_armed);
    for (std::size_t at = 0; at < recording.frames(); at += block) {
        engine.process(recording.part(at, std::min(at + block, recording.frames())));
    }
    engine.finish();
    return kept;
}

struct Agreement {
    double share = 0.0, rest_open = 0.0, run_closed = 0.0, slowest_close_s = 0.0, slowest_open_s = 0.0;
};

// What the gate said against what the animal did, second by second and change by change.
Agreement agreement(const Recording& recording, const Kept& kept, double from_s) {
    const auto runs_at = [&](double t) {
        return std::any_of(recording.happenings.begin(), recording.happenings.end(), [&](const auto& happening) {
            return happening.kind == HappeningKind::run && happening.onset_s <= t && t < happening.end_s;
        });
    };
    const auto gates = kept.of(EventKind::gate);
    const auto open_at = [&](double t) {
        bool open = true;
        for (const auto& gate : gates) {
            open = seconds_at(gate.sample, recording.rate) <= t ? gate.as<GateDetail>().open != 0 : open;
        }
        return open;
    };
    Agreement found;
    double same = 0.0, all = 0.0, rest = 0.0, rest_open = 0.0, run = 0.0, run_closed = 0.0;
    const double end_s = static_cast<double>(recording.frames()) / recording.rate.value;
    double since = from_s;
    bool waited = false;
    for (double t = from_s; t < end_s; t += 0.1) {
        const bool runs = runs_at(t), open = open_at(t);
        all += 1.0;
        same += runs != open ? 1.0 : 0.0;
        (runs ? run : rest) += 1.0;
        (runs ? run_closed : rest_open) += runs != open ? 1.0 : 0.0;
        if (runs != runs_at(t - 0.1)) {
            since = t;
            waited = true;
        }
        if (waited && runs != open) {
            waited = false;
            auto& slowest = runs ? found.slowest_close_s : found.slowest_open_s;
            slowest = std::max(slowest, t - since);
        }
    }
    found.share = same / all;
    found.rest_open = rest_open / rest;
    found.run_closed = run_closed / run;
    return found;
}

TEST(StateGate, AgreesWithRestAndRunningOfTheHardSceneNineTenthsOfTheTime) {
    const auto found = agreement(hard_scene(), run(hard_scene(), gated(), 1000), 15.0);
    EXPECT_GT(found.share, 0.90);
    EXPECT_GT(found.rest_open, 0.92);
    EXPECT_GT(found.run_closed, 0.80);
    EXPECT_LT(found.slowest_close_s, 5.0);
    EXPECT_LT(found.slowest_open_s, 5.0);
}

TEST(StateGate, DetectionsWhileItIsClosedAreRefusedByTheRuleGate) {
    const auto kept = run(hard_scene(), gated(), 1000);
    bool open = true;
    std::size_t refused = 0, triggers = 0;
    for (const auto& event : kept.events) {
        if (event.kind == EventKind::gate) {
            open = event.as<GateDetail>().open != 0;
        } else if (event.kind == EventKind::trigger) {
            EXPECT_TRUE(open) << event.sample.value;
            ++triggers;
        } else if (event.kind == EventKind::withheld && event.code == static_cast<std::uint8_t>(Rule::gate)) {
            EXPECT_FALSE(open) << event.sample.value;
            ++refused;
        }
    }
    EXPECT_GT(triggers, 50U);
    EXPECT_GT(refused, 5U);
}

// The first event that is not the same, in numbers; empty where all are. Whole lists would fill pages.
std::string first_difference(const std::vector<Event>& a, const std::vector<Event>& b) {
    for (std::size_t i = 0; i < std::min(a.size(), b.size()); ++i) {
        if (a[i] != b[i]) {
            return std::string(name_of(a[i].kind)) + " at " + std::to_string(a[i].sample.value) + " against " +
                   std::string(name_of(b[i].kind)) + " at " + std::to_string(b[i].sample.value);
        }
    }
    return a.size() == b.size() ? "" : std::to_string(a.size()) + " events against " + std::to_string(b.size());
}

TEST(StateGate, SameEventsAtAllPacketSizesAndVectorWidthsWithGapsInBetween) {
    auto recording = hard_scene();
    recording.data.resize(120 * 1250 * recording.channels.size());
    for (const std::size_t frame : {20000U, 20001U, 20777U, 90003U}) {
        recording.data[frame * recording.channels.size() + 1] = std::numeric_limits<float>::quiet_NaN();
    }
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        auto settings = gated();
        settings.detector.method = method;
        const auto expected = run(recording, settings, 1).events;
        ASSERT_GT(std::count_if(expected.begin(), expected.end(),
                                [](const auto& event) { return event.kind == EventKind::gate; }),
                  2);
        for (const std::size_t block : {7U, 64U, 1000U}) {
            EXPECT_EQ(first_difference(run(recording, settings, block).events, expected), "") << block;
        }
        EXPECT_EQ(first_difference(run(recording, settings, 64, KernelWidth::sse2).events, expected), "");
    }
}

TEST(StateGate, IsJournaledFromTheStartAndNoCommandMovesIt) {
    Kept kept;
    auto settings = gated();
    settings.arbiter.gates = {{"speed", true}};
    Engine engine(Detector::make(settings.detector, ripple_channels(2), Hertz{1250.0}), settings.arbiter, {},
                  Hertz{1250.0}, kept, kept);
    engine.start(SampleIndex{0}, true);
    ASSERT_EQ(kept.of(EventKind::gate).size(), 2U);
    EXPECT_STREQ(kept.of(EventKind::gate)[1].as<GateDetail>().name.data(), "state");
    EXPECT_FALSE(engine.set_gate(state_gate_name, false));
    EXPECT_TRUE(engine.set_gate("speed", false));
    EXPECT_EQ(kept.of(EventKind::gate).size(), 3U);
}

TEST(StateGate, WithoutItACommandMayCallAGateState) {
    Kept kept;
    EngineSettings settings;
    settings.arbiter.gates = {{"state", true}};
    Engine engine(Detector::make(settings.detector, ripple_channels(2), Hertz{1250.0}), settings.arbiter, {},
                  Hertz{1250.0}, kept, kept);
    EXPECT_TRUE(engine.set_gate("state", false));
}

// Disrupting at every chance: each pulse takes 25 ms of signal away.
TEST(StateGate, PulsesHardlyMoveIt) {
    auto pulsing = gated(), quiet = gated();
    pulsing.detector.method = quiet.detector.method = DetectionMethod::envelope;
    pulsing.detector.threshold.deviations = pulsing.detector.threshold.rearm_deviations = 1.0;
    pulsing.arbiter.lockout_ms = 30.0;
    pulsing.arbiter.limits = for_sweeps({});
    pulsing.arbiter.limits.max_pulses_per_second = 1000;
    quiet.arbiter.start_armed = false; // no triggers, so nothing is blanked
    const auto with = run(hard_scene(), pulsing, 1000), without = run(hard_scene(), quiet, 1000);
    ASSERT_GT(with.of(EventKind::trigger).size(), 500U);
    EXPECT_GT(agreement(hard_scene(), with, 15.0).share, agreement(hard_scene(), without, 15.0).share - 0.01);
}

TEST(StateGate, ASiteThatFailsDoesNotMoveItWithMethodEvidence) {
    auto scene = named_scene(SceneName::quiet);
    scene.duration_s = 90.0;
    scene.faults.failing_site = 2;
    scene.faults.failing_kind = FaultKind::huge;
    scene.faults.failing_at_s = 45.0;
    scene.faults.huge_uv = 20000.0;
    auto settings = gated();
    settings.detector.method = DetectionMethod::evidence;
    const auto gates = run(record(scene), settings, 64).of(EventKind::gate);
    EXPECT_EQ(gates.back().as<GateDetail>().open, 1);
}

TEST(StateGate, ClosesWhereThetaOutweighsDeltaAtEveryRate) {
    for (const double rate : {1250.0, 2000.0, 30000.0}) {
        Recording recording{ripple_channels(1), Hertz{rate}, {}, {}};
        for (std::size_t i = 0; i < static_cast<std::size_t>(40.0 * rate); ++i) {
            const double t = static_cast<double>(i) / rate;
            const bool theta = t >= 20.0;
            recording.data.push_back(
                static_cast<float>(200.0 * std::sin(2.0 * std::numbers::pi * (theta ? 7.5 : 2.0) * t) +
                                   10.0 * std::sin(2.0 * std::numbers::pi * (theta ? 2.0 : 7.5) * t)));
        }
        const auto gates = run(recording, gated(), 1000).of(EventKind::gate);
        ASSERT_EQ(gates.size(), 2U) << rate;
        const double at = seconds_at(gates[1].sample, recording.rate);
        EXPECT_GT(at, 20.0);
        EXPECT_LT(at, 22.0) << rate;
    }
}

TEST(StateGate, RunningDoesNotSpoilTheFloorOfRest) {
    // A gate by command: loud noise while it is closed, quiet noise while it is open.
    const auto floor_after = [](bool with_gate) {
        Kept kept;
        EngineSettings settings;
        settings.arbiter.gates = {{"speed", true}};
        settings.detector.method = DetectionMethod::envelope;
        settings.detector.floor.time_constant_s = 5.0;
        settings.detector.floor.clip_deviations = 100.0;
        Engine engine(Detector::make(settings.detector, ripple_channels(1), Hertz{1250.0}), settings.arbiter, {},
                      Hertz{1250.0}, kept, kept);
        engine.start(SampleIndex{0}, true);
        Random random(3, 0);
        std::vector<float> frame(1);
        for (std::uint64_t i = 0; i < 61 * 1250; ++i) {
            const bool loud = i >= 30 * 1250 && i < 60 * 1250;
            if (with_gate && (i == 30 * 1250 || i == 60 * 1250)) {
                engine.set_gate("speed", !loud);
            }
            frame[0] = static_cast<float>((loud ? 100.0 : 10.0) * random.normal());
            engine.process({SampleIndex{i}, 1, frame});
        }
        return kept.of(EventKind::floor);
    };
    const auto with = floor_after(true), without = floor_after(false);
    const auto mean_at = [](const std::vector<Event>& floors, std::size_t second) {
        return floors[2 * second - 1].as<FloorDetail>().mean;
    };
    EXPECT_NEAR(mean_at(with, 61), mean_at(with, 29), 0.2 * mean_at(with, 29));
    EXPECT_GT(mean_at(with, 59), 5.0 * mean_at(with, 29));
    EXPECT_GT(mean_at(without, 61), 3.0 * mean_at(with, 29)) << "else the memory would be of no use";
    EXPECT_EQ(with[2 * 59 - 1].as<FloorDetail>().gates_closed, 1U);
    EXPECT_EQ(with[2 * 61 - 1].as<FloorDetail>().gates_closed, 0U);
    EXPECT_EQ(with[2 * 59 - 1].as<FloorDetail>().settled, 1U) << "a memory that is new begins as a copy";
}

std::string refusal(const StateGateSettings& gate) {
    DetectorSettings settings;
    settings.state_gate = gate;
    settings.state_gate.on = true;
    try {
        static_cast<void>(Detector::make(settings, ripple_channels(2), Hertz{1250.0}));
    } catch (const Refusal& found) {
        return found.what();
    }
    return "no refusal";
}

TEST(StateGate, SettingsThatContradictEachOtherAreRefusedByName) {
    StateGateSettings gate;
    gate.open_below = gate.close_above;
    EXPECT_NE(refusal(gate).find("detector.state_gate.open_below"), std::string::npos);
    gate = {};
    gate.theta_low_hz = gate.theta_high_hz;
    EXPECT_NE(refusal(gate).find("detector.state_gate.theta_low_hz"), std::string::npos) << refusal(gate);
    gate = {};
    gate.signal = "reference";
    EXPECT_NE(refusal(gate).find("detector.state_gate.signal"), std::string::npos);
    gate.signal = "ch1";
    EXPECT_EQ(refusal(gate), "no refusal");
}

} // namespace
} // namespace millpond
