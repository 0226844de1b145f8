// All that a settings file may say, from every room, and how it is read, checked, written back and documented.
// Thread: control.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "base/channels.hpp"
#include "control/control_settings.hpp"
#include "detector/detector_settings.hpp"
#include "intake/stream_settings.hpp"
#include "journal/session_settings.hpp"
#include "outputs/output_settings.hpp"
#include "realtime/realtime_settings.hpp"

#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

struct Settings {
    StreamSettings stream;
    Channels channels; ///< empty: as many ripple sites as the stream or recording has
    DetectorSettings detector;
    ArbiterSettings arbiter;
    std::vector<OutputSettings> outputs = std::vector<OutputSettings>(1); ///< never empty
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
    visit.list("outputs", settings.outputs, "where pulses go: up to 8 lines");
    visit.group("control", settings.control, "where commands come from");
    visit.group("session", settings.session, "what is kept of a session");
    visit.group("realtime", settings.realtime, "how the loop runs on this computer");
}

/// Reads and checks a settings file; relative paths in it are taken from the file's own folder and made absolute.
/// Refuses unknown keys, values out of range, and rooms that contradict each other, naming file, line and key.
[[nodiscard]] Settings load_settings(const std::filesystem::path& file);

/// Of the outputs that follow pulses, the one whose pulses last longest; there is always one.
[[nodiscard]] const OutputSettings& pulse_output(const Settings& settings);

/// All settings as YAML that load_settings reads back to the same values.
[[nodiscard]] std::string settings_to_yaml(const Settings& settings);

/// Every key with unit, allowed values, default and meaning, as a Markdown table: the README's settings reference.
[[nodiscard]] std::string settings_reference();

} // namespace millpond
