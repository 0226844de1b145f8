// Which settings are worth having, and which one is picked. Thread: cold.
//
// The pick: settings whose false per minute on the training parts is at most the limit are ranked by their hit rate
// there (equal ones by the shorter median latency, then fewer false per minute, then their place in the grid). The
// first of them whose false per minute on the held-out parts is at most the limit too is picked. Held-out figures of
// the pick are untouched by tuning where it is the first of the ranking; each one passed over has used them once.
//
// The front: settings that no other one beats on the training parts, where beating is: at least the hit rate, at most
// the false per minute and at most the median latency, and better in one of them. Of equals the first stands for all.
#pragma once

#include "tuning/sweep_figures.hpp"

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

namespace millpond {

struct Pick {
    std::size_t index = 0;
    std::size_t passed_over = 0; ///< ranked before it, but above the limit on the held-out parts
};

/// Places in `results` of those at most at the limit on the training parts, best first.
[[nodiscard]] std::vector<std::size_t> ranking(std::span<const SweepResult> results, double max_false_per_minute);

/// Empty where nothing is at most at the limit on both parts.
[[nodiscard]] std::optional<Pick> pick(std::span<const SweepResult> results, double max_false_per_minute);

/// Places on the front by rising false per minute.
[[nodiscard]] std::vector<std::size_t> front(std::span<const SweepResult> results);

/// At most `most` places worth a run of the whole engine: the first half of them by ranking, then the front up to
/// ten times the limit, thinned evenly where it is longer; in the order of the grid. Training parts alone decide.
[[nodiscard]] std::vector<std::size_t> finalists(std::span<const SweepResult> results, double max_false_per_minute,
                                                 std::size_t most);

} // namespace millpond
