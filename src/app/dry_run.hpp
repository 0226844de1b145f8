// A dry run: the engine over a recording, as fast as it goes, scored against labels or the referee. Thread: cold.
#pragma once

#include "app/truth.hpp"
#include "base/channels.hpp"
#include "recording/events_table.hpp"
#include "referee/agreement.hpp"
#include "referee/referee.hpp"
#include "referee/scoring.hpp"
#include "settings/settings.hpp"
#include "tuning/offline_engine.hpp"

#include <array>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

namespace millpond {

struct DryRunPlan {
    std::filesystem::path recording, sidecar, settings, labels;
    LabelReading label_reading;
    std::string referee;    ///< a rule's name or a file; empty: the default rule
    bool agreement = false; ///< every rule beside each other, and beside the labels
    bool armed = true;
    std::size_t packet_frames = 4096; ///< frames given to the engine at a time; decisions do not depend on it
};

struct DryRun {
    std::string recording; ///< file name
    std::string format;
    Hertz rate;
    Channels channels;
    std::uint64_t frames = 0;
    std::string settings_hash;
    double filter_delay_ms = 0.0; ///< group delay of the band-pass at the band's centre
    double delay_ms = 0.0;        ///< the same and the smoother's delay
    double real_pace = 0.0;       ///< recording's length over the time the engine took
    bool armed = true;
    double pulse_width_ms = 0.0;
    std::vector<Event> events, orders;
    std::array<std::uint64_t, rule_count> withheld{};
    std::uint64_t gaps = 0, gap_frames = 0;

    std::string truth; ///< `referee`, or the name of the labels' file
    std::optional<RefereeSettings> referee_settings;
    RefereeFindings findings; ///< from labels: ripples alone
    Score score;
    std::optional<Agreement> agreement;
};

/// Refuses settings that do not fit the recording, and labels of another one. Notices go to standard error.
[[nodiscard]] DryRun dry_run(const DryRunPlan& plan);

} // namespace millpond
