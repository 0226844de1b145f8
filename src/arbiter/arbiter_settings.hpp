// What a user may say about when a detection becomes a pulse. Thread: control.
#pragma once

#include "arbiter/limits_settings.hpp"
#include "arbiter/plan_settings.hpp"
#include "arbiter/speed_gate_settings.hpp"
#include "base/describe.hpp"

#include <cstdint>
#include <string>
#include <vector>

namespace millpond {

enum class Condition : std::uint8_t {
    disrupt, ///< a pulse at once
    none,    ///< detection only, never a pulse
    schedule ///< pulses at the places of a control schedule, none at detections
};
inline constexpr Choice<Condition> conditions[] = {
    {Condition::disrupt, "disrupt"}, {Condition::none, "none"}, {Condition::schedule, "schedule"}};

struct GateSettings {
    std::string name;
    bool starts_open = true;

    bool operator==(const GateSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, GateSettings& gate) {
    visit.text("name", gate.name, "what commands call the gate; 1 to 31 characters");
    visit.flag("starts_open", gate.starts_open, "whether the gate is open before the first command");
}

struct ArbiterSettings {
    Condition condition = Condition::disrupt;
    std::string schedule_file;
    bool start_armed = false;
    double lockout_ms = 150.0;
    std::vector<GateSettings> gates;
    // Sections of their own in a settings file.
    LimitsSettings limits;
    PlanSettings plan;
    SpeedGateSettings speed_gate;

    bool operator==(const ArbiterSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ArbiterSettings& arbiter) {
    visit.choice("condition", arbiter.condition, conditions, "what happens to a detection");
    visit.text("schedule_file", arbiter.schedule_file, "control schedule to play (condition: schedule)");
    visit.flag("start_armed", arbiter.start_armed, "whether pulses are allowed from the start; else arm by command");
    visit.number("lockout_ms", arbiter.lockout_ms, {0.0, 60000.0},
                 "time after a trigger in which no other may follow, the same in every condition");
    visit.list("gates", arbiter.gates, "named gates; while one is closed no trigger is let through");
}

} // namespace millpond
