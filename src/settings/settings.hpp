// All that a settings file may say, from every room, and how it is read, checked, written back and documented.
// Thread: control.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "assignment/assignment_settings.hpp"
#include "base/channels.hpp"
#include "control/control_settings.hpp"
#include "detector/detector_settings.hpp"
#include "intake/stream_settings.hpp"
#include "journal/session_settings.hpp"
#include "outputs/output_settings.hpp"
#include "realtime/realtime_settings.hpp"
#include "sham/schedule_settings.hpp"
#include "stimulus/stimulus_settings.hpp"

#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

struct Settings {
    StreamSettings stream;
    Channels channels; ///< empty: as many ripple sites as the stream or recording has
    DetectorSettings detector;
    ArbiterSettings arbiter;
    AssignmentSettings assignment;
    ScheduleSettings schedule;
    std::vector<OutputSettings> outputs = std::vector<OutputSettings>(1); ///< never empty
    StimulusSettings stimulus;
    ControlSettings control;
    SessionSettings session;
    RealtimeSettings realtime;
};

template <class Visitor> void describe(Visitor& visit, Settings& settings) {
    visit.group("stream", settings.stream, "where samples come from in a live session");
    visit.list("channels", settings.channels,
               "what each channel of the stream or recording is, in its order; none: all are ripple sites");
    visit.group("detector", settings.detector, "when there is a ripple");
    visit.group("arbiter", settings.arbiter, "when a detection becomes a pulse");
    visit.group("limits", settings.arbiter.limits, "how many pulses are too many, and what ends a session's pulses");
    visit.group("plan", settings.arbiter.plan, "how a session is divided");
    visit.group("speed_gate", settings.arbiter.speed_gate, "a gate that follows the animal's speed");
    visit.group("assignment", settings.assignment, "which condition the session has, where a list says so");
    visit.group("schedule", settings.schedule,
                "control schedule that `sham rate-matched --settings` makes; a session reads it from the file");
    visit.list("outputs", settings.outputs, "where pulses go: up to 8 lines");
    visit.group("stimulus", settings.stimulus,
                "what the stimulator gives for one pulse: reckoned with, never permitted");
    visit.group("control", settings.control, "where commands come from");
    visit.group("session", settings.session, "what is kept of a session");
    visit.group("realtime", settings.realtime, "how the loop runs on this computer");
}

/// Reads and checks a settings file; relative paths in it are taken from the file's own folder and made absolute.
/// Refuses unknown keys, values out of range, and rooms that contradict each other, naming file, line and key.
[[nodiscard]] Settings load_settings(const std::filesystem::path& file);

/// What load_settings checks beyond single keys, for settings that were changed since. `file` names them.
void check_settings(const Settings& settings, const std::string& file);

/// Of the outputs that follow pulses, the one whose pulses last longest; there is always one.
[[nodiscard]] const OutputSettings& pulse_output(const Settings& settings);

/// All settings as YAML that load_settings reads back to the same values.
[[nodiscard]] std::string settings_to_yaml(const Settings& settings);

/// Every key with unit, allowed values, default and meaning, as a Markdown table: the README's settings reference.
[[nodiscard]] std::string settings_reference();

} // namespace millpond
