// Shared passes against the engine itself: same detections, one by one, and the same eligible time.
#include "base/refusal.hpp"
#include "support/invented_recording.hpp"
#include "tuning/offline_engine.hpp"
#include "tuning/shared_pass.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::InventedRecording;

constexpr Hertz rate{1250.0};

// Three sites, a reference and an unused channel; ripples, a burst on all channels, steps, gaps of many lengths.
struct Trial {
    Channels channels{{"a", ChannelRole::ripple},
                      {"b", ChannelRole::ripple},
                      {"spare", ChannelRole::unused},
                      {"c", ChannelRole::ripple},
                      {"r", ChannelRole::reference}};
    std::vector<float> data;

    explicit Trial(double seconds = 60.0) {
        InventedRecording recording(seconds, 12.0, 90.0);
        const auto frames = recording.data.size() / 2;
        const auto more = test::white_noise(frames, 3, 10.0, 7);
        for (std::size_t f = 0; f < frames; ++f) {
            const float burst = f % 9001 < 60 ? 6.0F : 1.0F; // loud on all: the reference vetoes
            data.insert(data.end(), {recording.data[2 * f], recording.data[2 * f + 1] * burst, std::nanf(""),
                                     recording.data[2 * f] * 0.7F + more[3 * f], more[3 * f + 2] * burst});
        }
    }
    [[nodiscard]] std::size_t frames() const { return data.size() / channels.size(); }
    void lose(std::size_t from, std::size_t count, std::size_t channel = 0) {
        for (std::size_t f = from; f < std::min(from + count, frames()); ++f) {
            data[f * channels.size() + channel] = std::nanf("");
        }
    }
    [[nodiscard]] Trial with_gaps() const {
        auto other = *this;
        other.lose(0, 3);                     // before the first frame
        other.lose(700, 40);                  // in the floor's first second
        other.lose(12499, 1);                 // up to a whole second, where floors are journaled
        other.lose(20000, 1);                 // one frame
        other.lose(23750, 1250, 4);           // a whole second, of the reference alone
        other.lose(30010, 2500);              // across two
        other.lose(other.frames() - 5, 5, 1); // to the end
        for (std::size_t f = 40000; f < 40400; f += 7) {
            other.lose(f, 2, 3); // frames between gaps never settle
        }
        return other;
    }
};

struct Expected {
    std::vector<SampleIndex> detections;
    Intervals eligible;
    std::size_t refused_by_detector = 0;
};

Expected engine_without_pulses(const Trial& trial, const DetectorSettings& settings) {
    auto engine = OfflineEngine::make({settings, {}}, trial.channels, rate);
    engine.start(false); // no triggers, so nothing is blanked
    engine.process({SampleIndex{0}, trial.channels.size(), trial.data});
    engine.finish();
    Expected expected;
    expected.detections = detections_to_score(engine.events());
    auto rules = EligibleRules{};
    rules.settle_frames = engine.detector().filter_settle_frames();
    rules.blanking_ms = settings.blanking_ms; // no trigger: it blanks nothing
    expected.eligible = eligible_time(engine.events(), rules, rate, SampleIndex{0}, engine.next_sample());
    for (const auto& event : engine.events()) {
        expected.refused_by_detector +=
            event.kind == EventKind::withheld &&
                    (event.code == static_cast<int>(Rule::gap) || event.code == static_cast<int>(Rule::veto))
                ? 1
                : 0;
    }
    return expected;
}

PassFindings pass_over(const Trial& trial, std::span<const DetectorSettings> settings) {
    const std::atomic<bool> stop{false};
    std::atomic<std::uint64_t> seen{0};
    return run_shared_pass(settings, trial.channels, rate, trial.data, stop, seen);
}

void expect_the_engines_own(const Trial& trial, std::span<const DetectorSettings> settings) {
    const auto pass = pass_over(trial, settings);
    ASSERT_EQ(pass.found.size(), settings.size());
    std::size_t detections = 0;
    for (std::size_t i = 0; i < settings.size(); ++i) {
        const auto expected = engine_without_pulses(trial, settings[i]);
        EXPECT_EQ(pass.found[i].detections, expected.detections)
            << "setting " << i << ", threshold " << settings[i].threshold.deviations;
        EXPECT_EQ(pass.found[i].eligible, expected.eligible) << "setting " << i;
        detections += expected.detections.size();
    }
    EXPECT_GT(detections, settings.size() * 5); // there was something to compare
}

// More settings than one batch holds, everything after the envelope different from one to the next.
DetectorSettings envelope_settings() {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    return settings;
}

std::vector<DetectorSettings> many(const DetectorSettings& base, std::size_t count) {
    std::vector<DetectorSettings> settings;
    for (std::size_t i = 0; i < count; ++i) {
        auto each = base;
        each.threshold.deviations = 1.5 + 0.25 * static_cast<double>(i);
        each.threshold.rearm_deviations = std::min(each.threshold.deviations, 0.5 * static_cast<double>(i % 7));
        each.threshold.min_above_ms = i % 3 == 1 ? 6.0 : 0.0;
        each.floor.freeze_ms = i % 4 == 0 ? 0.0 : 40.0 * static_cast<double>(i % 4);
        each.floor.time_constant_s = i % 5 == 2 ? 0.3 : 5.0 + static_cast<double>(i % 5);
        each.floor.settle_s = i % 6 == 3 ? 0.5 : i % 2 == 0 ? 3.0 : 12.0;
        each.floor.clip_deviations = 1.5 + static_cast<double>(i % 3);
        each.veto.deviations = 2.0 + static_cast<double>(i % 4);
        each.veto.window_ms = i % 8 == 0 ? 900.0 : 20.0;
        each.vote.sites_needed = 1 + static_cast<int>(i % 3);
        settings.push_back(each);
    }
    return settings;
}

TEST(SharedPass, DetectsWhatTheEngineDetectsForEveryThreshold) {
    std::vector<DetectorSettings> settings;
    for (double deviations = 1.0; deviations <= 9.0; deviations += 0.5) {
        settings.emplace_back();
        settings.back().threshold.deviations = deviations;
        settings.back().threshold.rearm_deviations = std::min(deviations, 3.0);
    }
    expect_the_engines_own(Trial(), settings);
}

// The gate of the animal's state moves: floors change their memories, some before they have settled. And steps.
TEST(SharedPass, DoesSoWhereTheStateChangesAndTheSignalJumps) {
    auto trial = Trial();
    for (std::size_t f = 0; f < trial.frames(); ++f) {
        const bool theta = f / 6250 % 3 == 1; // from 5 to 10 s, from 20 to 25 s, and so on
        const double turns = (theta ? 7.5 : 2.0) * static_cast<double>(f) / rate.value;
        const double step = f % 4001 > 2000 ? 1500.0 : 0.0;
        for (std::size_t c = 0; c < trial.channels.size(); ++c) {
            trial.data[f * trial.channels.size() + c] +=
                static_cast<float>(100.0 * std::sin(2.0 * 3.14159265358979 * turns) + step);
        }
    }
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        DetectorSettings base;
        base.method = method;
        base.state_gate.on = true;
        base.state_gate.smoothing_s = 0.3;
        base.mains.method = MainsMethod::adaptive;
        auto settings = many(base, 20);
        for (std::size_t i = 0; i < settings.size(); ++i) {
            settings[i].evidence.false_per_minute = 2.0 + static_cast<double>(i);
        }
        expect_the_engines_own(trial, settings);
        expect_the_engines_own(trial.with_gaps(), settings);
    }
}

TEST(SharedPass, DoesSoAcrossGapsVetoesFreezesAndHoldTimes) {
    const auto trial = Trial().with_gaps();
    expect_the_engines_own(trial, many(envelope_settings(), 40));
    EXPECT_GT(engine_without_pulses(trial, many(envelope_settings(), 40)[1]).refused_by_detector, 3U);
}

TEST(SharedPass, DoesSoForVotesOfSitesAndOtherEnvelopes) {
    auto base = envelope_settings();
    base.vote.rule = VoteRule::count;
    base.envelope.method = EnvelopeMethod::energy;
    base.filter.family = FilterFamily::fir_minimum_phase;
    expect_the_engines_own(Trial().with_gaps(), many(base, 18));
    base.envelope.method = EnvelopeMethod::rectify;
    base.filter.family = FilterFamily::elliptic;
    base.filter.order = 3;
    expect_the_engines_own(Trial().with_gaps(), many(base, 18));
}

// Evidence may be below zero, sites may die, and its threshold follows from the false per minute asked for.
TEST(SharedPass, DoesSoForEvidenceWithASiteThatDies) {
    DetectorSettings base;
    base.method = DetectionMethod::evidence;
    auto settings = many(base, 24);
    for (std::size_t i = 0; i < settings.size(); ++i) {
        settings[i].evidence.false_per_minute = 0.05 * std::pow(2.0, static_cast<double>(i % 12));
    }
    auto trial = Trial().with_gaps();
    expect_the_engines_own(trial, settings);
    for (std::size_t f = 35000; f < trial.frames(); ++f) {
        trial.data[f * trial.channels.size() + 1] = 7.0F; // flat
    }
    expect_the_engines_own(trial, settings);
}

TEST(SharedPass, DoesSoForEvidenceThatHangsFarBelowZero) {
    DetectorSettings base;
    base.method = DetectionMethod::evidence;
    for (auto& feature : base.evidence.features) {
        feature.weight = feature.weight > 0.0 ? feature.weight : 4.0 * feature.weight;
    }
    auto settings = many(base, 20);
    for (std::size_t i = 0; i < settings.size(); ++i) {
        settings[i].evidence.false_per_minute = 10.0 * static_cast<double>(i + 1);
    }
    expect_the_engines_own(Trial(), settings);
}

TEST(SharedPass, DoesSoOnAFlatChannelAndARecordingTooShortToSettle) {
    Trial trial(20.0);
    for (std::size_t f = 15000; f < trial.frames(); ++f) {
        trial.data[f * 5 + 4] = 0.0F; // numbers below the least normal one come up here
    }
    const auto settings = many(envelope_settings(), 5);
    const auto pass = pass_over(trial, settings);
    for (std::size_t i = 0; i < settings.size(); ++i) {
        const auto expected = engine_without_pulses(trial, settings[i]);
        EXPECT_EQ(pass.found[i].detections, expected.detections) << i;
        EXPECT_EQ(pass.found[i].eligible, expected.eligible) << i;
    }
    trial.data.resize(5 * 900);
    EXPECT_TRUE(pass_over(trial, settings).found[0].eligible.empty());
}

TEST(SharedPass, RefusesSettingsThatContradictThemselvesWhereverTheyStand) {
    auto settings = many(envelope_settings(), 3);
    settings[2].threshold.rearm_deviations = settings[2].threshold.deviations + 1.0;
    EXPECT_THROW(static_cast<void>(pass_over(Trial(20.0), settings)), Refusal);
}

TEST(SharedPass, EndsEarlyWhenToldTo) {
    const Trial trial(20.0);
    const std::atomic<bool> stop{true};
    std::atomic<std::uint64_t> seen{0};
    const auto settings = many(envelope_settings(), 2);
    EXPECT_TRUE(run_shared_pass(settings, trial.channels, rate, trial.data, stop, seen).found.empty());
    EXPECT_EQ(seen, 0U);
}

} // namespace
} // namespace millpond
