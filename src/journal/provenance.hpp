// What a session was made with and on: program, computer, clock, stream. Thread: control.
#pragma once

#include "base/channels.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <nlohmann/json.hpp>

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

/// What the program knows and the journal does not.
struct SessionAbout {
    std::string program; ///< name, version, build type, compiler
    Hertz rate;
    Channels channels; ///< in stream order
    std::uint32_t floor_count = 0;
    std::string kernel_width;          ///< vector width of the detector's kernel
    double filter_delay_samples = 0.0; ///< group delay of the band-pass at the band's centre
    double delay_samples = 0.0;        ///< the same and the smoother's delay
    std::vector<FloorDetail>
        warm_start;       ///< floors that the session started from, as given to the detector; empty: none
    bool blinded = false; ///< tables that are made when the session closes do not tell of its pulses; not kept
    nlohmann::json more = nlohmann::json::object(); ///< anything else worth keeping, written as it is
    std::string settings_text;                      ///< the settings as used, YAML
};

/// As read back from provenance.json. `settings_text` is in settings.yaml.
struct Provenance {
    SessionAbout about;
    std::string machine, kernel, cpu, clock_source;
    std::int64_t start_utc_ns = 0;
};

/// Asks the computer what it is.
[[nodiscard]] Provenance gather_provenance(const SessionAbout& about, std::int64_t start_utc_ns);
[[nodiscard]] nlohmann::json to_json(const Provenance& provenance);
/// Refuses a file that is not what `to_json` makes.
[[nodiscard]] Provenance read_provenance(const std::filesystem::path& file);

/// `2026-03-01T09:30:00.000000Z`; `compact` gives `20260301T093000Z` instead, for names of folders.
[[nodiscard]] std::string utc_text(std::int64_t utc_ns, bool compact = false);

} // namespace millpond
