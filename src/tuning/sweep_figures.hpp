// What a sweep keeps of each setting: small, so that thousands fit, and exact in a file. Thread: cold.
#pragma once

#include "referee/scoring.hpp"

#include <cstdint>

namespace millpond {

/// A score without its lists (words: referee/scoring.hpp).
struct PartFigures {
    std::uint64_t hits = 0, ripples = 0, repeats = 0, false_detections = 0;
    std::uint64_t before_half = 0, halves_known = 0; ///< hits with elapsed share <= 0.5, of those with a duration
    std::uint64_t eligible_frames = 0;
    double eligible_minutes = 0.0;
    double false_per_minute = not_known;
    double latency_median_ms = not_known, latency_p90_ms = not_known;

    [[nodiscard]] Proportion hit_rate() const noexcept { return proportion(hits, ripples); }
};

[[nodiscard]] inline PartFigures figures_of(const Score& score, std::uint64_t eligible_frames) {
    return {score.hits,
            score.eligible_ripples,
            score.repeats,
            score.false_detections,
            score.before_half.count,
            score.before_half.of,
            eligible_frames,
            score.eligible_minutes,
            score.false_per_minute,
            score.onset_latency_ms.median,
            score.onset_latency_ms.p90};
}

struct SweepResult {
    PartFigures training, held_out;
    double delay_ms = 0.0; ///< of filter and smoother
};

} // namespace millpond
