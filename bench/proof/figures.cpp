#include "proof/figures.hpp"

#include "base/random.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace millpond::bench {
namespace {

constexpr int draws = 1000;
constexpr std::uint64_t bootstrap_seed = 20;

Counts sum_of(const CurvePoint& point, const std::vector<std::size_t>& recordings) {
    Counts sum;
    for (const auto i : recordings) {
        sum += point.by_recording[i];
    }
    return sum;
}

// Without the latencies: for picking.
const CurvePoint* picked(const Curve& curve, const std::vector<std::size_t>& recordings, double most_false) {
    const CurvePoint* best = nullptr;
    double best_hits = -1.0;
    for (const auto& point : curve) {
        double hits = 0.0, false_detections = 0.0, minutes = 0.0;
        for (const auto i : recordings) {
            hits += point.by_recording[i].hits;
            false_detections += point.by_recording[i].false_detections;
            minutes += point.by_recording[i].minutes;
        }
        if (false_detections <= most_false * minutes * (1.0 + 1e-9) && hits > best_hits) {
            best = &point;
            best_hits = hits;
        }
    }
    return best;
}

std::vector<std::size_t> every_one(std::size_t count) {
    std::vector<std::size_t> all(count);
    std::iota(all.begin(), all.end(), std::size_t{0});
    return all;
}

struct Plain {
    double found, median, p90, before_half, false_per_minute;
};

Plain plain(const Counts& counts, Hertz rate) {
    return {counts.hit_rate(), counts.latency_ms(0.5, rate), counts.latency_ms(0.9, rate),
            counts.hits > 0.0 ? counts.before_half / counts.hits : std::nan(""), counts.false_per_minute()};
}

Estimate estimate(double Plain::*figure, const Plain& whole, const std::vector<Plain>& drawn) {
    std::vector<double> values;
    for (const auto& each : drawn) {
        if (std::isfinite(each.*figure)) {
            values.push_back(each.*figure);
        }
    }
    std::sort(values.begin(), values.end());
    return {whole.*figure, quantile(values, 0.025), quantile(values, 0.975)};
}

template <class Pick> Figures with_intervals(const CurvePoint& chosen, const Pick& pick, Hertz rate) {
    const std::size_t n = chosen.by_recording.size();
    const auto whole = plain(chosen.sum(), rate);
    Random random(bootstrap_seed, 0);
    std::vector<Plain> drawn;
    std::vector<std::size_t> recordings(n);
    for (int draw = 0; draw < draws; ++draw) {
        for (auto& each : recordings) {
            each = std::min(static_cast<std::size_t>(random.uniform() * static_cast<double>(n)), n - 1);
        }
        if (const CurvePoint* point = pick(recordings)) {
            drawn.push_back(plain(sum_of(*point, recordings), rate));
        }
    }
    return {chosen.threshold,
            estimate(&Plain::found, whole, drawn),
            estimate(&Plain::median, whole, drawn),
            estimate(&Plain::p90, whole, drawn),
            estimate(&Plain::before_half, whole, drawn),
            estimate(&Plain::false_per_minute, whole, drawn)};
}

} // namespace

Counts& Counts::operator+=(const Counts& other) {
    hits += other.hits;
    ripples += other.ripples;
    false_detections += other.false_detections;
    before_half += other.before_half;
    minutes += other.minutes;
    latencies.resize(std::max(latencies.size(), other.latencies.size()));
    std::transform(other.latencies.begin(), other.latencies.end(), latencies.begin(), latencies.begin(), std::plus<>());
    return *this;
}

void Counts::add_hit(std::uint64_t latency_frames, std::uint64_t duration_frames) {
    hits += 1.0;
    before_half += 2 * latency_frames <= duration_frames ? 1.0 : 0.0;
    latencies.resize(std::max<std::size_t>(latencies.size(), latency_frames + 1));
    latencies[latency_frames] += 1.0;
}

double Counts::latency_ms(double share, Hertz rate) const noexcept {
    double below = 0.0;
    for (std::size_t i = 0; i < latencies.size(); ++i) {
        below += latencies[i];
        if (below >= share * hits && hits > 0.0) {
            return static_cast<double>(i) * 1000.0 / rate.value;
        }
    }
    return std::nan("");
}

Counts counts_of(const ProofRecording& recording, std::span<const SampleIndex> detections, const Intervals& eligible) {
    const auto scored = score(recording.truth, detections, eligible, 0.0, recording.rate);
    Counts counts;
    counts.ripples = static_cast<double>(scored.eligible_ripples);
    counts.false_detections = static_cast<double>(scored.false_detections);
    counts.minutes = scored.eligible_minutes;
    for (std::size_t i = 0; i < detections.size(); ++i) {
        if (scored.detections[i] != DetectionOutcome::hit) {
            continue;
        }
        const auto next = std::upper_bound(recording.truth.begin(), recording.truth.end(), detections[i],
                                           [](SampleIndex at, const Ripple& ripple) { return at < ripple.onset; });
        const auto& ripple = *std::prev(next); // a scene's ripples do not overlap
        counts.add_hit(detections[i] - ripple.onset, ripple.end - ripple.onset);
    }
    return counts;
}

Counts CurvePoint::sum() const {
    return sum_of(*this, every_one(by_recording.size()));
}

std::optional<Figures> figures_at(const Curve& curve, double most_false_per_minute, Hertz rate) {
    if (curve.empty()) {
        return std::nullopt;
    }
    const auto all = every_one(curve.front().by_recording.size());
    const auto* chosen = picked(curve, all, most_false_per_minute);
    if (chosen == nullptr) {
        return std::nullopt;
    }
    return with_intervals(
        *chosen, [&](const auto& recordings) { return picked(curve, recordings, most_false_per_minute); }, rate);
}

Figures figures_of(const CurvePoint& point, Hertz rate) {
    return with_intervals(
        point, [&](const auto&) { return &point; }, rate);
}

} // namespace millpond::bench
