// Is this computer fit for a session? Each check says what it found and, where that is not good, what to do.
// Thread: control. Changes nothing on the computer except a file it writes and removes to time the disk.
#pragma once

#include "realtime/realtime_settings.hpp"

#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

enum class Fitness : std::uint8_t {
    good,    ///< nothing to do
    caution, ///< works, and may be late or end early: read what it says
    bad      ///< a session with these settings will not start, or must not
};

struct Finding {
    Fitness fitness = Fitness::good;
    std::string about; ///< two or three words
    std::string found; ///< what was found, and the remedy where there is something to mend
};

/// Whether the loop's priority, core and memory lock can be had.
[[nodiscard]] std::vector<Finding> check_rights(const RealtimeSettings& settings);

/// The kernel stops a real-time thread that never sleeps for a part of every second, unless that limit is lifted.
[[nodiscard]] Finding check_throttling(const RealtimeSettings& settings);

/// Clock source, and whether this computer's time is disciplined by another's (it matters for the transport part only).
[[nodiscard]] std::vector<Finding> check_clock();

/// How late this thread wakes from 1 ms sleeps, over `seconds`: what the scheduler does to a loop right now.
[[nodiscard]] Finding check_wake(const RealtimeSettings& settings, double seconds);

/// Free space against what a session needs, and how fast the disk takes data, as a multiple of what the stream brings.
[[nodiscard]] std::vector<Finding> check_disk(const std::filesystem::path& folder, double bytes_per_second,
                                              double min_free_mb);

} // namespace millpond
