// Scores detections against ripples. Thread: cold.
//
// A detection at d belongs to a ripple when onset - early <= d <= end; where two ripples would have it, to the earlier
// one that has begun, else to the earlier one. The first detection of a ripple makes it a hit, later ones are repeats,
// neither hits nor false. A ripple without one is a miss. A detection of no ripple is false. Only ripples whose onset
// lies in eligible time count, and only false detections in eligible time; `outside` counts the detections left out for
// that reason. One case needs a word: a detection that comes up to `early` before the onset may put the onset into its
// own blanking or lock-out; its ripple counts all the same where the detection itself lies in eligible time.
//
// hit rate = hits / eligible ripples; precision = (hits + repeats) / (hits + repeats + false); false per minute divides
// by eligible minutes. Shares come with a 95 % interval (Wilson 1927, J Am Stat Assoc 22:209), which takes the events
// as independent. onset latency = d - onset, elapsed share = onset latency / duration, over hits.
#pragma once

#include "base/units.hpp"
#include "referee/eligible_time.hpp"
#include "referee/ripple.hpp"

#include <cstdint>
#include <limits>
#include <span>
#include <string_view>
#include <vector>

namespace millpond {

/// A figure that the data cannot give is not-a-number, `null` in JSON, `n/a` in tables.
inline constexpr double not_known = std::numeric_limits<double>::quiet_NaN();

/// `count` of `of` with its 95 % Wilson interval; all NaN where `of` is 0.
struct Proportion {
    std::uint64_t count = 0, of = 0;
    double share = not_known, low = not_known, high = not_known;
};
[[nodiscard]] Proportion proportion(std::uint64_t count, std::uint64_t of) noexcept;

/// Quantile of sorted values with linear interpolation between neighbours; NaN where there are none.
[[nodiscard]] double quantile(std::span<const double> sorted, double q) noexcept;

struct Distribution {
    std::uint64_t count = 0;
    /// NaN where count is 0.
    double least = not_known, quartile1 = not_known, median = not_known, quartile3 = not_known, p90 = not_known,
           p99 = not_known, most = not_known;
};
[[nodiscard]] Distribution distribution(std::vector<double> values);

/// Counts of values in bins of equal width; bin i is [from + i width, from + (i + 1) width).
struct Bins {
    double from = 0.0, width = 5.0;
    std::vector<std::uint64_t> counts;
};
[[nodiscard]] Bins bins_of(std::span<const double> values, double width);

enum class DetectionOutcome : std::uint8_t {
    hit,    ///< first of its ripple
    repeat, ///< a later one of the same ripple
    stray,  ///< of no ripple: false (a word that C++ keeps for itself)
    outside ///< not counted: outside eligible time, or of a ripple that does not count
};
[[nodiscard]] std::string_view name_of(DetectionOutcome outcome) noexcept;

enum class RippleOutcome : std::uint8_t {
    hit,
    miss,
    outside
};
[[nodiscard]] std::string_view name_of(RippleOutcome outcome) noexcept;

struct Score {
    double early_ms = 0.0;
    std::uint64_t hits = 0, misses = 0, repeats = 0, false_detections = 0, outside = 0;
    std::uint64_t eligible_ripples = 0;
    double eligible_minutes = 0.0;
    double false_per_minute = not_known; ///< NaN where no minute is eligible
    Proportion hit_rate, precision;
    Distribution onset_latency_ms;
    Bins onset_latency_bins; ///< 5 ms wide
    Distribution elapsed_share;
    Proportion before_half;                   ///< hits with elapsed share <= 0.5; ripples without duration left out
    std::vector<DetectionOutcome> detections; ///< one for each detection given
    std::vector<RippleOutcome> ripples;       ///< one for each ripple given
};

/// `ripples` by onset, `detections` ascending, `eligible` as eligible_time gives it. `early_ms`: 0 for the generator's
/// truth and labels, referee_early_ms for the referee.
[[nodiscard]] Score score(const Ripples& ripples, std::span<const SampleIndex> detections, const Intervals& eligible,
                          double early_ms, Hertz rate);

/// The referee's smoothing places onsets late.
inline constexpr double referee_early_ms = 10.0;

} // namespace millpond
