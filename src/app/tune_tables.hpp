// A sweep's outcome as text to read and as tables. Thread: cold.
#pragma once

#include "app/tune_outcome.hpp"

#include <string>

namespace millpond {

/// The confirmed settings on their front, training and held-out parts side by side, by rising false per minute: the
/// `most` best of the ranking. `*` marks the pick, which is always there.
[[nodiscard]] std::string front_summary(const TuneCandidates& candidates, const TuneOutcome& outcome,
                                        double max_false_per_minute, std::size_t most);

/// Hit rate against false per minute as a picture of characters: the front of all settings without pulses, on the
/// training parts and, the same settings, on the held-out parts. Empty where nothing was scored.
[[nodiscard]] std::string curve_picture(const TuneOutcome& outcome, double max_false_per_minute);

/// Why this one, in one sentence.
[[nodiscard]] std::string pick_sentence(const TuneCandidates& candidates, const TuneOutcome& outcome,
                                        double max_false_per_minute);

/// Lines about figures of the pick that few labels or minutes leave wide; empty where they do not.
[[nodiscard]] std::string doubts(const SweepResult& picked, double max_false_per_minute);

/// All settings, tab-separated, in grid order: without pulses, and confirmed where they were.
[[nodiscard]] std::string sweep_table(const TuneCandidates& candidates, const TuneOutcome& outcome);

/// The front alone, by rising false per minute, with Wilson intervals: the points of the curve.
[[nodiscard]] std::string curve_table(const TuneCandidates& candidates, const TuneOutcome& outcome);

} // namespace millpond
