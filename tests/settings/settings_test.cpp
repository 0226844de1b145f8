#include "base/refusal.hpp"
#include "settings/settings.hpp"
#include "support/files.hpp"

#include <gtest/gtest.h>

#include <fstream>

namespace millpond {
namespace {

class SettingsFile : public testing::Test {
  protected:
    test::TemporaryFolder folder;
    std::filesystem::path file = folder / "rig.yaml";

    Settings load(const std::string& text) {
        std::ofstream(file) << text;
        return load_settings(file);
    }
    /// The one line that says why `text` was refused; empty where it was not.
    std::string refusal(const std::string& text) {
        try {
            load(text);
        } catch (const Refusal& refused) {
            return refused.what();
        }
        return {};
    }
};

TEST_F(SettingsFile, EmptyGivesTheDefaults) {
    EXPECT_EQ(settings_to_yaml(load("{}")).substr(0, 7), "stream:");
    EXPECT_EQ(load("").detector, DetectorSettings{});
}

TEST_F(SettingsFile, WrittenOutReadsBackToTheSameValues) {
    auto settings = load("channels: [{name: a}, {name: b, role: reference}]\n"
                         "detector: {filter: {family: elliptic, low_hz: 130.123456789}}\n"
                         "arbiter: {gates: [{name: immobile, starts_open: false}]}\n");
    const auto text = settings_to_yaml(settings);
    const auto again = load(text);
    EXPECT_EQ(settings_to_yaml(again), text);
    EXPECT_EQ(again.detector, settings.detector);
    EXPECT_EQ(again.channels, settings.channels);
    EXPECT_EQ(again.arbiter, settings.arbiter);
}

TEST_F(SettingsFile, UnknownKeyIsRefusedWithFileLineAndNearestKnownKey) {
    const auto line = refusal("detector:\n  threshold:\n    deviatons: 4\n");
    EXPECT_NE(line.find("rig.yaml:3: detector.threshold.deviatons"), std::string::npos) << line;
    EXPECT_NE(line.find("did you mean 'deviations'?"), std::string::npos) << line;
}

TEST_F(SettingsFile, ValuesOutOfRangeOfTheWrongKindOrTwiceAreRefused) {
    for (const auto* text :
         {"detector: {filter: {order: 99}}", "detector: {filter: {order: 2.5}}", "detector: {filter: {low_hz: many}}",
          "detector: {filter: {low_hz: .nan}}", "detector: {filter: {family: bessel}}", "detector: 3", "[1, 2]",
          "arbiter: {start_armed: 7}", "channels: {name: a}", "detector: {blanking_ms: 1, blanking_ms: 2}",
          "detector: {filter: [}"}) {
        const auto line = refusal(text);
        EXPECT_NE(line.find("; allowed: "), std::string::npos) << text << " -> " << line;
        EXPECT_NE(line.find("rig.yaml:1"), std::string::npos) << line;
        EXPECT_EQ(line.find('\n'), std::string::npos) << line;
    }
}

TEST_F(SettingsFile, RoomsThatContradictEachOtherAreRefused) {
    EXPECT_NE(refusal("detector: {threshold: {deviations: 3, rearm_deviations: 4}}").find("rearm_deviations"),
              std::string::npos);
    EXPECT_NE(refusal("detector: {filter: {low_hz: 260}}").find("low_hz"), std::string::npos);
    EXPECT_NE(refusal("{arbiter: {lockout_ms: 20}, outputs: [{width_ms: 30}]}").find("lockout_ms"), std::string::npos);
    EXPECT_NE(refusal("arbiter: {condition: yoked}").find("schedule_file"), std::string::npos);
    EXPECT_NE(refusal("arbiter: {gates: [{name: a}, {name: a}]}").find("gates[0]"), std::string::npos);
    EXPECT_NE(refusal("{detector: {state_gate: {on: true}}, arbiter: {gates: [{name: state}]}}").find("arbiter.gates"),
              std::string::npos);
    EXPECT_NE(refusal("{speed_gate: {on: true}, arbiter: {gates: [{name: speed}]}}").find("arbiter.gates"),
              std::string::npos);
    EXPECT_NE(refusal("speed_gate: {closes_above: 3, opens_below: 4}").find("speed_gate.opens_below"),
              std::string::npos);
    EXPECT_NE(refusal("plan: {epochs: [{minutes: 3}]}").find("plan.epochs[0].name"), std::string::npos);
    EXPECT_NE(refusal("plan: {epochs: [{name: a name of 22 letters..}]}").find("1 to 21"), std::string::npos);
    EXPECT_NE(refusal("plan: {ends_session: true}").find("plan.ends_session"), std::string::npos);
    EXPECT_NE(refusal("limits: {floor: {least_uv: 9, most_uv: 8}}").find("limits.floor.least_uv"), std::string::npos);
    EXPECT_NE(refusal("limits: {floor: {channels: [{channel: 1, least_uv: 9, most_uv: 8}]}}")
                  .find("limits.floor.channels[0].least_uv"),
              std::string::npos);
}

TEST_F(SettingsFile, LimitsPlanSpeedGateAndStimulusStandInSectionsOfTheirOwn) {
    const auto settings = load("limits: {max_pulses_per_minute: 30, runaway: {expected_per_s: 0.7}}\n"
                               "plan: {epochs: [{name: rest, minutes: 20, pulses: false}, {name: track}]}\n"
                               "speed_gate: {on: true, unit: m/s, closes_above: 0.05, opens_below: 0.04}\n"
                               "stimulus: {current_ua: 140, phase_us: 100, diameter_um: 50, shape: hemisphere}\n");
    EXPECT_EQ(settings.arbiter.limits.max_pulses_per_minute, 30U);
    EXPECT_EQ(settings.arbiter.limits.runaway.expected_per_s, 0.7);
    ASSERT_EQ(settings.arbiter.plan.epochs.size(), 2U);
    EXPECT_FALSE(settings.arbiter.plan.epochs[0].pulses);
    EXPECT_EQ(settings.arbiter.speed_gate.unit, SpeedUnit::m_per_s);
    EXPECT_EQ(settings.stimulus.shape, ElectrodeShape::hemisphere);
    EXPECT_EQ(load(settings_to_yaml(settings)).arbiter, settings.arbiter);
    EXPECT_EQ(load(settings_to_yaml(settings)).stimulus, settings.stimulus);
}

TEST_F(SettingsFile, OutputsThatCannotBeAreRefusedByNameAndKey) {
    for (const auto& [text, place] : std::vector<std::pair<std::string, std::string>>{
             {"outputs: [{name: a, kind: serial_lines}]", "outputs.a.device"},
             {"outputs: [{name: a}, {name: a}]", "outputs.a.name"},
             {"outputs: [{name: ''}]", "name"},
             {"outputs: [{name: a, width_ms: 5, longest_high_ms: 5}]", "outputs.a.longest_high_ms"},
             {"outputs: [{name: a, follows: trigger}]", "follows: pulse"},
             {"outputs: []", "follows: pulse"},
             {"outputs: [{name: a, condition: sham}]", "outputs.a.condition"},
             {"outputs: [{name: a}, {name: b, follows: trigger, condition: delayed}]", "outputs.b.condition"},
             {"outputs: [{name: a, kind: lamp}]", "outputs[0].kind"},
             {"outputs: [{name: a, width_ms: 1}, {name: b, follows: trigger, width_ms: 200}]", "outputs.b lasts"},
             {"outputs: [{name: a},{name: b},{name: c},{name: d},{name: e},{name: f},{name: g},{name: h},{name: i}]",
              "at most 8"}}) {
        const auto line = refusal(text);
        EXPECT_NE(line.find(place), std::string::npos) << text << " -> " << line;
    }
}

TEST_F(SettingsFile, OneOutputWithoutItsListIsRefusedWithTheKeyThatIsMeant) {
    const auto line = refusal("output: {kind: osc}");
    EXPECT_NE(line.find("rig.yaml:1: output"), std::string::npos) << line;
    EXPECT_NE(line.find("did you mean 'outputs'?"), std::string::npos) << line;
}

TEST_F(SettingsFile, PulseOutputIsTheLongestOfThoseThatFollowPulses) {
    const auto settings = load("outputs: [{name: a, width_ms: 1}, {name: b, width_ms: 3}, {name: c, width_ms: 9, "
                               "follows: trigger}]");
    EXPECT_EQ(pulse_output(settings).name, "b");
    EXPECT_EQ(pulse_output(load("{}")).kind, OutputKind::silent);
}

TEST_F(SettingsFile, MissingFileIsRefused) {
    EXPECT_THROW((void)load_settings(folder / "none.yaml"), Refusal);
}

TEST_F(SettingsFile, PathsAreSeenFromTheSettingsFile) {
    EXPECT_EQ(load("session: {folder: here}").session.folder,
              std::filesystem::weakly_canonical(folder / "here").string());
}

TEST(SettingsReference, NamesEveryKeyWithItsDefault) {
    const auto reference = settings_reference();
    EXPECT_NE(reference.find("| `detector.threshold.deviations` | 0.1 to 100 | 6 |"), std::string::npos) << reference;
    EXPECT_NE(reference.find("| `arbiter.gates[].name` |"), std::string::npos);
}

} // namespace
} // namespace millpond
