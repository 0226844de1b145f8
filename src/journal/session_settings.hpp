// What a user may say about the session folder. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>

namespace millpond {

enum class StoreSamples : std::uint8_t {
    none, ///< no samples: the audit cannot run the engine again
    rf64, ///< RF64 (EBU Tech 3306): WAV without its 4 GB limit
    w64   ///< Sony Wave64
};
inline constexpr Choice<StoreSamples> store_samples_choices[] = {
    {StoreSamples::none, "none"}, {StoreSamples::rf64, "rf64"}, {StoreSamples::w64, "w64"}};

struct SessionSettings {
    std::string folder = "sessions";
    std::string name = "session";
    StoreSamples store_samples = StoreSamples::rf64;
    double min_free_mb = 500.0;

    bool operator==(const SessionSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SessionSettings& session) {
    visit.text("folder", session.folder, "where session folders are made, one for each session");
    visit.text("name", session.name,
               "end of the session folder's name, after its UTC start time: letters, digits, dot, - and _");
    visit.choice(
        "store_samples", session.store_samples, store_samples_choices,
        "samples as the engine saw them, as float32 microvolts; without them the audit cannot run the engine again");
    visit.number("min_free_mb", session.min_free_mb, {1.0, 1e9},
                 "free disk space below which no session starts and a running one stops pulsing");
}

} // namespace millpond
