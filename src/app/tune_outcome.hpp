// What a sweep came to: all settings without pulses, some confirmed by the whole engine, one of these picked.
// Thread: cold.
#pragma once

#include "app/tune_grid.hpp"
#include "tuning/pick.hpp"
#include "tuning/sweep.hpp"

#include <optional>
#include <vector>

namespace millpond {

/// Settings run again by the whole engine at first, and as many again for each round in which none of them is picked.
inline constexpr std::size_t finalist_count = 10;

struct TuneOutcome {
    std::vector<SweepResult> swept;           ///< of every candidate
    std::vector<std::size_t> confirmed_at;    ///< places of those confirmed, in grid order
    std::vector<SweepResult> confirmed;       ///< theirs, likewise
    std::vector<std::size_t> front;           ///< places on the front, by figures without pulses
    std::vector<std::size_t> confirmed_front; ///< places of those confirmed that are on their own front
    std::optional<std::size_t> picked;        ///< place
    std::size_t passed_over = 0;

    /// The confirmed result of a place, null where there is none.
    [[nodiscard]] const SweepResult* confirmed_of(std::size_t place) const noexcept;
};

/// From results of the sweep (all known) and of those confirmed so far.
[[nodiscard]] TuneOutcome outcome_of(const SweepResults& swept, const SweepResults& confirmed,
                                     double max_false_per_minute);

/// Places to confirm next: at first the finalists, then the next ones of the ranking; empty where none is left.
[[nodiscard]] std::vector<std::size_t> next_to_confirm(const TuneOutcome& outcome, double max_false_per_minute);

} // namespace millpond
