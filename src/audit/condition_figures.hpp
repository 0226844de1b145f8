// What a session did in each of its conditions, and whether two conditions had the same chance to detect.
// Thread: cold.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "base/event.hpp"
#include "referee/eligible_time.hpp"

#include <span>
#include <string>
#include <vector>

namespace millpond {

struct ConditionFigures {
    Condition condition{};
    std::uint64_t units = 0; ///< sessions, blocks or trials of that condition
    double minutes = 0.0, eligible_minutes = 0.0;
    std::uint64_t detections = 0; ///< in eligible time: those that could become triggers
    std::uint64_t triggers = 0, catch_trials = 0, orders = 0, pulses = 0;
    std::vector<double> trigger_intervals_s; ///< between triggers of one unit, ascending

    /// Per eligible minute; NaN where there was none.
    [[nodiscard]] double detections_per_minute() const noexcept;
    [[nodiscard]] double triggers_per_minute() const noexcept;
};

/// The conditions of consecutive units; one for the whole of a session without an assignment. `eligible`: the session's
/// reading (referee/eligible_time.hpp). Units beyond the list have none.
[[nodiscard]] std::vector<ConditionFigures> condition_figures(std::span<const Event> events,
                                                              std::span<const Condition> list,
                                                              const Intervals& eligible, Hertz rate, SampleIndex end);

struct RateComparison {
    Condition one{}, other{};
    double ratio = 0.0; ///< detections per eligible minute of `one` over those of `other`
    double p = 1.0;     ///< exact conditional test of two Poisson rates, two-sided (Przyborowski & Wilenski 1940)
};

/// Of every two that have eligible time.
[[nodiscard]] std::vector<RateComparison> compare_rates(std::span<const ConditionFigures> figures);

/// The chance of a split at least as unlikely as this one, where both rates are the same: given their sum, the first
/// count is binomial with the share of its time. Two-sided by the sum of all outcomes no likelier.
[[nodiscard]] double same_rate_p(std::uint64_t one, double one_minutes, std::uint64_t other, double other_minutes);

} // namespace millpond
