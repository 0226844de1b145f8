#include "referee/scoring.hpp"

#include <algorithm>
#include <cmath>
#include <optional>

namespace millpond {
namespace {

/// Where `early` frames before `at` lies, not before the first frame.
SampleIndex before(SampleIndex at, std::uint64_t early) noexcept {
    return SampleIndex{at.value > early ? at.value - early : 0};
}

// Ripples and detections both ascend, so the search begins where earlier ripples have ended for good.
class Owner {
  public:
    Owner(const Ripples& ripples, std::uint64_t early) : ripples_(ripples), early_(early) {}

    [[nodiscard]] std::optional<std::size_t> of(SampleIndex detection) {
        while (first_ < ripples_.size() && ripples_[first_].end < detection) {
            ++first_;
        }
        std::optional<std::size_t> not_begun;
        for (std::size_t i = first_; i < ripples_.size(); ++i) {
            const auto& ripple = ripples_[i];
            if (before(ripple.onset, early_) > detection) {
                break;
            }
            if (ripple.onset <= detection && detection <= ripple.end) {
                return i;
            }
            if (detection < ripple.onset && !not_begun) {
                not_begun = i;
            }
        }
        return not_begun;
    }

  private:
    const Ripples& ripples_;
    std::uint64_t early_;
    std::size_t first_ = 0;
};

double ms_between(SampleIndex from, SampleIndex to, Hertz rate) noexcept {
    return (static_cast<double>(to.value) - static_cast<double>(from.value)) * 1000.0 / rate.value;
}

using FirstDetections = std::vector<std::optional<std::size_t>>; // by ripple

void judge_ripples(Score& result, const Ripples& ripples, std::span<const SampleIndex> detections,
                   const FirstDetections& first, const Intervals& eligible) {
    for (std::size_t i = 0; i < ripples.size(); ++i) {
        const auto onset = ripples[i].onset;
        const bool came_early = first[i] && detections[*first[i]] < onset && contains(eligible, detections[*first[i]]);
        if (!contains(eligible, onset) && !came_early) {
            result.ripples.push_back(RippleOutcome::outside);
            continue;
        }
        ++result.eligible_ripples;
        result.ripples.push_back(first[i] ? RippleOutcome::hit : RippleOutcome::miss);
        ++(first[i] ? result.hits : result.misses);
    }
}

void judge_detections(Score& result, std::span<const SampleIndex> detections,
                      const std::vector<std::optional<std::size_t>>& owners, const FirstDetections& first,
                      const Intervals& eligible) {
    for (std::size_t d = 0; d < detections.size(); ++d) {
        const auto owner = owners[d];
        auto outcome = DetectionOutcome::outside;
        if (owner && result.ripples[*owner] == RippleOutcome::hit) {
            outcome = first[*owner] == d ? DetectionOutcome::hit : DetectionOutcome::repeat;
        } else if (!owner && contains(eligible, detections[d])) {
            outcome = DetectionOutcome::stray;
        }
        result.repeats += outcome == DetectionOutcome::repeat ? 1 : 0;
        result.false_detections += outcome == DetectionOutcome::stray ? 1 : 0;
        result.outside += outcome == DetectionOutcome::outside ? 1 : 0;
        result.detections.push_back(outcome);
    }
}

void time_hits(Score& result, const Ripples& ripples, std::span<const SampleIndex> detections,
               const FirstDetections& first, Hertz rate) {
    std::vector<double> latencies, shares;
    std::uint64_t before_half = 0;
    for (std::size_t i = 0; i < ripples.size(); ++i) {
        if (result.ripples[i] != RippleOutcome::hit) {
            continue;
        }
        const double latency = ms_between(ripples[i].onset, detections[*first[i]], rate);
        const double duration = ms_between(ripples[i].onset, ripples[i].end, rate);
        latencies.push_back(latency);
        if (duration > 0.0) {
            shares.push_back(latency / duration);
            before_half += shares.back() <= 0.5 ? 1 : 0;
        }
    }
    result.before_half = proportion(before_half, shares.size());
    result.onset_latency_bins = bins_of(latencies, 5.0);
    result.onset_latency_ms = distribution(std::move(latencies));
    result.elapsed_share = distribution(std::move(shares));
}

} // namespace

Proportion proportion(std::uint64_t count, std::uint64_t of) noexcept {
    if (of == 0) {
        return {count, of};
    }
    constexpr double z = 1.959963984540054; // 97.5 % point of the normal law
    const double n = static_cast<double>(of);
    const double p = static_cast<double>(count) / n;
    const double centre = (p + z * z / (2.0 * n)) / (1.0 + z * z / n);
    const double half = z / (1.0 + z * z / n) * std::sqrt(p * (1.0 - p) / n + z * z / (4.0 * n * n));
    // At 0 and at all of them the interval ends there exactly, which rounding may miss.
    return {count, of, p, count == 0 ? 0.0 : centre - half, count == of ? 1.0 : centre + half};
}

double quantile(std::span<const double> sorted, double q) noexcept {
    if (sorted.empty()) {
        return not_known;
    }
    const double place = q * static_cast<double>(sorted.size() - 1);
    const auto below = static_cast<std::size_t>(place);
    const auto above = std::min(below + 1, sorted.size() - 1);
    return sorted[below] + (place - static_cast<double>(below)) * (sorted[above] - sorted[below]);
}

Distribution distribution(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    return {values.size(),          quantile(values, 0.0), quantile(values, 0.25), quantile(values, 0.5),
            quantile(values, 0.75), quantile(values, 0.9), quantile(values, 0.99), quantile(values, 1.0)};
}

Bins bins_of(std::span<const double> values, double width) {
    Bins bins{0.0, width, {}};
    if (values.empty()) {
        return bins;
    }
    const auto [least, most] = std::minmax_element(values.begin(), values.end());
    bins.from = std::min(0.0, std::floor(*least / width) * width);
    bins.counts.resize(static_cast<std::size_t>((*most - bins.from) / width) + 1);
    for (const double value : values) {
        ++bins.counts[static_cast<std::size_t>((value - bins.from) / width)];
    }
    return bins;
}

std::string_view name_of(DetectionOutcome outcome) noexcept {
    switch (outcome) {
    case DetectionOutcome::hit:
        return "hit";
    case DetectionOutcome::repeat:
        return "repeat";
    case DetectionOutcome::stray:
        return "false";
    case DetectionOutcome::outside:
        return "outside";
    }
    return "unknown";
}

std::string_view name_of(RippleOutcome outcome) noexcept {
    switch (outcome) {
    case RippleOutcome::hit:
        return "hit";
    case RippleOutcome::miss:
        return "miss";
    case RippleOutcome::outside:
        return "outside";
    }
    return "unknown";
}

Score score(const Ripples& ripples, std::span<const SampleIndex> detections, const Intervals& eligible, double early_ms,
            Hertz rate) {
    Owner owner(ripples, frames_in_ms(early_ms, rate));
    std::vector<std::optional<std::size_t>> owners;
    FirstDetections first(ripples.size());
    for (std::size_t d = 0; d < detections.size(); ++d) {
        owners.push_back(owner.of(detections[d]));
        if (owners[d] && !first[*owners[d]]) {
            first[*owners[d]] = d;
        }
    }
    Score result;
    result.early_ms = early_ms;
    judge_ripples(result, ripples, detections, first, eligible);
    judge_detections(result, detections, owners, first, eligible);
    time_hits(result, ripples, detections, first, rate);
    result.hit_rate = proportion(result.hits, result.eligible_ripples);
    const auto right = result.hits + result.repeats;
    result.precision = proportion(right, right + result.false_detections);
    const auto frames = static_cast<double>(frames_in(eligible));
    result.eligible_minutes = frames / rate.value / 60.0;
    result.false_per_minute =
        frames > 0.0 ? static_cast<double>(result.false_detections) / result.eligible_minutes : not_known;
    return result;
}

} // namespace millpond
