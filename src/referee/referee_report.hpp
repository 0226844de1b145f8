// What the referee did, in words and as JSON, the same wherever it is told. Thread: cold.
#pragma once

#include "referee/referee.hpp"

#include <nlohmann/json.hpp>

#include <string>

namespace millpond {

/// Name of the rule; `millpond, changed` where its values are not the default ones.
[[nodiscard]] std::string rule_text(const RefereeSettings& settings);

/// `left out 3.4 s: 1 missing, 0 railed, 0 flat, 11 common; 2 events dropped`, and dead channels by name; how common
/// rises were looked for, where they were not.
[[nodiscard]] std::string artefacts_text(const RefereeSettings& settings, const RefereeFindings& findings,
                                         const Channels& channels, Hertz rate);

/// Settings, floor, frames judged and artefacts.
[[nodiscard]] nlohmann::ordered_json referee_json(const RefereeSettings& settings, const RefereeFindings& findings,
                                                  const Channels& channels, Hertz rate);

} // namespace millpond
