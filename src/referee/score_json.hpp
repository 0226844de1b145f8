// A score and its parts as JSON, the same keys wherever a score is written. Thread: cold.
#pragma once

#include "referee/referee.hpp"
#include "referee/scoring.hpp"

#include <nlohmann/json.hpp>

namespace millpond {

using Json = nlohmann::ordered_json;

/// Null where a figure is not known.
[[nodiscard]] Json json_of(double figure);
[[nodiscard]] Json json_of(const Proportion& proportion);
[[nodiscard]] Json json_of(const Distribution& values);
[[nodiscard]] Json json_of(const Bins& bins);
[[nodiscard]] Json json_of(const RefereeSettings& settings);
/// All figures, without the outcome of each detection and ripple.
[[nodiscard]] Json json_of(const Score& score);

/// What the words of a score mean, for the reader of the file.
[[nodiscard]] Json score_definitions();

} // namespace millpond
