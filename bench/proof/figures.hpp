// Counts of one detector on several recordings, and the figures made of them. Thread: one.
//
// Figures at a false rate are those of the threshold with the most hits among those whose false detections over all
// test recordings together are at most so many a minute. Intervals: 95 %, bootstrap over seeds (Efron 1979, Ann Stat
// 7:1): recordings are drawn with replacement, and the threshold is picked anew in every draw.
#pragma once

#include "proof/recordings.hpp"

#include <optional>
#include <string>

namespace millpond::bench {

/// One threshold on one recording. Doubles, since the floor's false detections are a theory's.
struct Counts {
    double hits = 0.0, ripples = 0.0, false_detections = 0.0, before_half = 0.0, minutes = 0.0;
    std::vector<double> latencies; ///< hits by their onset latency in frames

    Counts& operator+=(const Counts& other);
    void add_hit(std::uint64_t latency_frames, std::uint64_t duration_frames);
    [[nodiscard]] double hit_rate() const noexcept { return ripples > 0.0 ? hits / ripples : 0.0; }
    [[nodiscard]] double false_per_minute() const noexcept { return minutes > 0.0 ? false_detections / minutes : 0.0; }
    [[nodiscard]] double latency_ms(double quantile, Hertz rate) const noexcept;
};

/// Generator's truth: `early` is 0.
[[nodiscard]] Counts counts_of(const ProofRecording& recording, std::span<const SampleIndex> detections,
                               const Intervals& eligible);

struct CurvePoint {
    double threshold = 0.0;
    std::vector<Counts> by_recording;

    [[nodiscard]] Counts sum() const;
};
using Curve = std::vector<CurvePoint>;

struct Estimate {
    double value = 0.0, low = 0.0, high = 0.0;
};

struct Figures {
    double threshold = 0.0;
    Estimate found, latency_median_ms, latency_p90_ms, before_half, false_per_minute;
};

/// None where no threshold has so few false detections.
[[nodiscard]] std::optional<Figures> figures_at(const Curve& curve, double most_false_per_minute, Hertz rate);
/// Of a threshold that was not picked on these recordings.
[[nodiscard]] Figures figures_of(const CurvePoint& point, Hertz rate);

} // namespace millpond::bench
