#include "app/tune_grid.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::string figure(double value, int decimals) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : "n/a";
}

std::string columns_of(const Score& score) {
    return fmt::format("{:>4}/{:<4} {:>5} {:>7} {:>6} {:>6}", score.hits, score.eligible_ripples,
                       figure(100.0 * score.hit_rate.share, 1), figure(score.false_per_minute, 2),
                       figure(score.onset_latency_ms.median, 1), figure(score.onset_latency_ms.p90, 1));
}

std::string line_of(const DetectorSettings& detector, const SweepResult& result, bool is_pick) {
    return fmt::format("{} {:>5}-{:<5} {:>5} {:>9} {:>9}  | {} | {}\n", is_pick ? '*' : ' ', detector.filter.low_hz,
                       detector.filter.high_hz, detector.filter.order, detector.envelope.smoothing_ms,
                       detector.threshold.deviations, columns_of(result.training), columns_of(result.held_out));
}

// `score` as five tab-separated figures.
std::string cells_of(const Score& score) {
    return fmt::format("{}\t{}\t{}\t{}\t{}\t{}", score.hits, score.eligible_ripples, figure(score.hit_rate.share, 4),
                       figure(score.false_per_minute, 4), figure(score.onset_latency_ms.median, 2),
                       figure(score.onset_latency_ms.p90, 2));
}

} // namespace

std::vector<DetectorSettings> candidates_of(const TuneGrid& grid, const DetectorSettings& base) {
    std::vector<DetectorSettings> candidates;
    auto detector = base;
    for (const double low : grid.low_hz) {
        for (const double high : grid.high_hz) {
            for (const int order : grid.order) {
                for (const double smoothing : grid.smoothing_ms) {
                    for (const double deviations : grid.threshold_deviations) {
                        detector.filter.low_hz = low;
                        detector.filter.high_hz = high;
                        detector.filter.order = order;
                        detector.envelope.smoothing_ms = smoothing;
                        detector.threshold.deviations = deviations;
                        detector.threshold.rearm_deviations = std::min(base.threshold.rearm_deviations, deviations);
                        if (low < high) {
                            candidates.push_back(detector);
                        }
                    }
                }
            }
        }
    }
    return candidates;
}

std::string sweep_summary(std::span<const DetectorSettings> candidates, std::span<const SweepResult> results,
                          double max_false_per_minute, std::optional<Pick> picked, std::size_t most) {
    auto order = ranking(results, max_false_per_minute);
    const std::size_t at_most_the_limit = order.size();
    for (std::size_t i = 0; i < results.size(); ++i) {
        if (std::find(order.begin(), order.begin() + static_cast<std::ptrdiff_t>(at_most_the_limit), i) ==
            order.begin() + static_cast<std::ptrdiff_t>(at_most_the_limit)) {
            order.push_back(i);
        }
    }
    std::string text = fmt::format("{} of {} settings at most at {} false per minute on the training parts\n",
                                   at_most_the_limit, results.size(), max_false_per_minute);
    text +=
        "                                        | training                          | held out\n"
        "  band Hz     order smoothing threshold | hits/of  hit %  false  latency ms | hits/of  hit %  false  latency "
        "ms\n"
        "                           ms deviations|                /min median    p90 |                /min median    "
        "p90\n";
    for (std::size_t i = 0; i < std::min(most, order.size()); ++i) {
        const auto index = order[i];
        text += line_of(candidates[index], results[index], picked && picked->index == index);
    }
    if (order.size() > most) {
        text += fmt::format("  ... and {} more\n", order.size() - most);
    }
    return text;
}

std::string sweep_table(std::span<const DetectorSettings> candidates, std::span<const SweepResult> results,
                        std::optional<Pick> picked) {
    std::string text = "low_hz\thigh_hz\torder\tsmoothing_ms\tthreshold_deviations\tdelay_ms\tpicked";
    for (const auto* part : {"training", "held_out"}) {
        text += fmt::format("\t{0}_hits\t{0}_ripples\t{0}_hit_rate\t{0}_false_per_minute\t{0}_latency_median_ms\t"
                            "{0}_latency_p90_ms",
                            part);
    }
    for (std::size_t i = 0; i < results.size(); ++i) {
        const auto& detector = candidates[i];
        text += fmt::format("\n{}\t{}\t{}\t{}\t{}\t{:.2f}\t{}\t{}\t{}", detector.filter.low_hz, detector.filter.high_hz,
                            detector.filter.order, detector.envelope.smoothing_ms, detector.threshold.deviations,
                            results[i].delay_ms, picked && picked->index == i ? 1 : 0, cells_of(results[i].training),
                            cells_of(results[i].held_out));
    }
    return text + "\n";
}

} // namespace millpond
