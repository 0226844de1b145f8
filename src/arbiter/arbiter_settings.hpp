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

/// What becomes of triggers. Which detections are triggers does not depend on it.
enum class Condition : std::uint8_t {
    disrupt,      ///< a pulse at once
    delayed,      ///< a pulse a while later, when no ripple is going on
    yoked,        ///< pulses at the places of another session's pulses, none at triggers
    rate_matched, ///< pulses at random places made beforehand, none at triggers
    none,         ///< never a pulse
    assigned      ///< one of the above, by a list made beforehand
};
inline constexpr Choice<Condition> conditions[] = {
    {Condition::disrupt, "disrupt"},           {Condition::delayed, "delayed"}, {Condition::yoked, "yoked"},
    {Condition::rate_matched, "rate_matched"}, {Condition::none, "none"},       {Condition::assigned, "assigned"}};
/// Whether a condition plays a control schedule.
[[nodiscard]] constexpr bool plays_schedule(Condition condition) noexcept {
    return condition == Condition::yoked || condition == Condition::rate_matched;
}

/// Delayed pulses that may be waiting at once.
inline constexpr std::size_t most_delayed_slots = 1024;

struct DelaySettings {
    double least_ms = 150.0;
    double most_ms = 250.0;
    bool in_every_condition = false;

    bool operator==(const DelaySettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, DelaySettings& delay) {
    visit.number("least_ms", delay.least_ms, {0.0, 10000.0}, "shortest delay of a pulse after its trigger");
    visit.number("most_ms", delay.most_ms, {0.0, 10000.0},
                 "longest; between the two all are equally likely, equal: a fixed delay");
    visit.flag("in_every_condition", delay.in_every_condition,
               "whether the moments of delayed pulses are blanked in the other conditions too, without a pulse: on in "
               "every session that is compared with a delayed one");
}

struct HoldSettings {
    double quiet_ms = 20.0;
    double longest_ms = 250.0;
    bool schedule = true;

    bool operator==(const HoldSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, HoldSettings& hold) {
    visit.number("quiet_ms", hold.quiet_ms, {0.0, 1000.0},
                 "a delayed pulse waits until the detector has been below its threshold for so long");
    visit.number("longest_ms", hold.longest_ms, {0.0, 10000.0}, "longest such wait; then there is no pulse, rule held");
    visit.flag(
        "schedule", hold.schedule,
        "whether places of a control schedule wait likewise; false for pulses yoked to those of another session");
}

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
    DelaySettings delay;
    HoldSettings hold;
    double catch_share = 0.0;
    std::uint64_t seed = 0;
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
    visit.choice("condition", arbiter.condition, conditions, "what becomes of a trigger");
    visit.text("schedule_file", arbiter.schedule_file,
               "control schedule to play (yoked, rate_matched); in other conditions its places are blanked, without a "
               "pulse: name it in every session that is compared with one that plays it");
    visit.group("delay", arbiter.delay, "when delayed pulses come");
    visit.group("hold", arbiter.hold, "how a moment for a pulse waits until no ripple is going on");
    visit.number("catch_share", arbiter.catch_share, {0.0, 1.0},
                 "share of triggers, drawn at random, that get no pulse in any condition: catch trials");
    visit.whole(
        "seed", arbiter.seed, {0, 9007199254740992.0},
        "of the draws of delays and catch trials (xoshiro256++); 0: another one in each session, kept in its settings");
    visit.flag("start_armed", arbiter.start_armed, "whether pulses are allowed from the start; else arm by command");
    visit.number("lockout_ms", arbiter.lockout_ms, {0.0, 60000.0},
                 "time after a trigger in which no other may follow, the same in every condition");
    visit.list("gates", arbiter.gates, "named gates; while one is closed no trigger is let through");
}

} // namespace millpond
