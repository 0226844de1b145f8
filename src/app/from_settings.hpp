// What settings ask for, made for the stream or recording at hand: shared by commands. Thread: cold.
#pragma once

#include "assignment/unblinding.hpp"
#include "base/channels.hpp"
#include "detector/detector.hpp"
#include "settings/settings.hpp"
#include "sham/schedule.hpp"

#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// Channels that a run over a recording or stream uses: the settings' where they list some, else its own. Refuses a
/// list of another length; `where` names the settings.
[[nodiscard]] Channels channels_for(const Settings& settings, const Channels& recorded, const std::string& where);

/// Floors that the settings want to start from; empty where they name no session.
[[nodiscard]] std::vector<FloorState> warm_start_floors(const DetectorSettings& detector);

/// Refuses a range in limits.floor.channels for a channel that has no floor.
void check_floor_channels(const FloorLimitSettings& limits, const Detector& detector);
/// What the settings allow a control schedule.
[[nodiscard]] ScheduleLimits limits_of(const ArbiterSettings& arbiter);

/// The control schedule that the settings name, checked against the arbiter's limits; empty where they name none.
[[nodiscard]] Schedule schedule_for(const ArbiterSettings& arbiter, Hertz rate);

/// The conditions of a session by its assignment.
struct Assigned {
    SessionAssignment kept; ///< what the session may say of it
    std::vector<Condition> list;
    std::uint64_t block_frames = 0; ///< 0: units are not blocks
};

/// Reads the list that the settings name; empty where they name none. Where it has delayed pulses for some sessions,
/// their moments are blanked in this one too, whatever it is: `settings` says so afterwards. Refuses a list with
/// scheduled pulses where the settings name no schedule. `where` names the settings.
[[nodiscard]] std::optional<Assigned> assigned_for(Settings& settings, Hertz rate, const std::string& where);

/// 16 hexadecimal digits: FNV-1a, 64 bits, of what decides: detector, arbiter and channels as YAML. Places of files
/// that the settings name enter by name, not by content.
[[nodiscard]] std::string settings_hash(const Settings& settings, const Channels& channels);

} // namespace millpond
