// The grid of a sweep and its table. Thread: cold.
#pragma once

#include "detector/detector_settings.hpp"
#include "tuning/sweep.hpp"

#include <optional>
#include <span>
#include <string>
#include <vector>

namespace millpond {

struct TuneGrid {
    std::vector<double> low_hz{130.0, 150.0};
    std::vector<double> high_hz{250.0};
    std::vector<int> order{1, 2, 3};
    std::vector<double> smoothing_ms{2.0, 4.0, 8.0};
    std::vector<double> threshold_deviations{2.0, 2.5, 3.0, 3.5, 4.0, 5.0, 6.0, 8.0};
};

/// Every combination on top of `base`, thresholds innermost; pairs with low_hz at or above high_hz are left out. The
/// re-arm level stays as in `base`, but never above the threshold.
[[nodiscard]] std::vector<DetectorSettings> candidates_of(const TuneGrid& grid, const DetectorSettings& base);

/// Lines to read: the best `most` by the ranking, then others in grid order; `*` marks the pick.
[[nodiscard]] std::string sweep_summary(std::span<const DetectorSettings> candidates,
                                        std::span<const SweepResult> results, double max_false_per_minute,
                                        std::optional<Pick> picked, std::size_t most);

/// All of them, tab-separated, in grid order.
[[nodiscard]] std::string sweep_table(std::span<const DetectorSettings> candidates,
                                      std::span<const SweepResult> results, std::optional<Pick> picked);

} // namespace millpond
