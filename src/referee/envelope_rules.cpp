#include "referee/envelope_rules.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::vector<float> gaussian_half(double deviation_frames) {
    const auto radius = static_cast<std::size_t>(4.0 * deviation_frames + 0.5);
    std::vector<double> half(radius + 1);
    double sum = 0.0;
    for (std::size_t i = 0; i <= radius; ++i) {
        const double z = static_cast<double>(i) / deviation_frames;
        half[i] = std::exp(-0.5 * z * z);
        sum += i == 0 ? half[i] : 2.0 * half[i];
    }
    std::vector<float> weights;
    for (const double weight : half) {
        weights.push_back(static_cast<float>(weight / sum));
    }
    return weights;
}

Ripple event_between(std::span<const float> envelope, SampleIndex first, std::size_t from, std::size_t to) {
    const auto peak = std::max_element(envelope.begin() + static_cast<std::ptrdiff_t>(from),
                                       envelope.begin() + static_cast<std::ptrdiff_t>(to));
    const auto place = static_cast<std::uint64_t>(peak - envelope.begin());
    return {first + from, first + place, first + (to - 1), static_cast<double>(*peak)};
}

Ripples merged(const Ripples& events, double merge_gap_ms, Hertz rate) {
    Ripples ripples;
    for (const auto& event : events) {
        const bool near = !ripples.empty() &&
                          static_cast<double>(event.onset - ripples.back().end) * 1000.0 < merge_gap_ms * rate.value;
        if (!near) {
            ripples.push_back(event);
            continue;
        }
        auto& whole = ripples.back();
        whole.end = event.end;
        if (event.peak_envelope > whole.peak_envelope) {
            whole.peak = event.peak;
            whole.peak_envelope = event.peak_envelope;
        }
    }
    return ripples;
}

// Durations run from the first frame to the last.
bool stays_above(std::span<const float> envelope, double level, double least_ms, Hertz rate) {
    std::size_t longest = 0, length = 0;
    for (const float value : envelope) {
        length = static_cast<double>(value) >= level ? length + 1 : 0;
        longest = std::max(longest, length);
    }
    return longest > 0 && static_cast<double>(longest - 1) * 1000.0 >= least_ms * rate.value;
}

double partly_sorted_quantile(std::span<float> values, double q) {
    const double place = q * static_cast<double>(values.size() - 1);
    const auto below = values.begin() + static_cast<std::ptrdiff_t>(place);
    std::nth_element(values.begin(), below, values.end());
    const double low = static_cast<double>(*below);
    if (below + 1 == values.end()) {
        return low;
    }
    const double high = static_cast<double>(*std::min_element(below + 1, values.end()));
    return low + (place - std::floor(place)) * (high - low);
}

} // namespace

std::vector<FrameRun> finite_runs(std::span<const float> values) {
    std::vector<FrameRun> runs;
    bool inside = false;
    for (std::size_t i = 0; i < values.size(); ++i) {
        const bool finite = !std::isnan(values[i]);
        if (finite && !inside) {
            runs.push_back({i, i});
        }
        if (finite) {
            runs.back().to = i + 1;
        }
        inside = finite;
    }
    return runs;
}

void smooth_gaussian(std::span<float> values, double deviation_frames) {
    const auto weights = gaussian_half(deviation_frames);
    const std::size_t radius = weights.size() - 1;
    const std::size_t count = values.size();
    // Blocks keep the working set in the cache; `padded` holds one block and its neighbours, zero beyond the ends.
    constexpr std::size_t block = 4096;
    std::vector<float> behind(radius, 0.0F);
    std::vector<float> padded(block + 2 * radius);
    std::vector<float> sums(block);
    std::vector<double> reach(radius + 2, 0.0); // reach[n]: sum of the n+1 weights from the centre outwards
    double so_far = 0.0;
    for (std::size_t i = 0; i <= radius; ++i) {
        so_far += static_cast<double>(weights[i]);
        reach[i] = so_far;
    }
    for (std::size_t at = 0; at < count; at += block) {
        const std::size_t length = std::min(block, count - at);
        std::copy(behind.begin(), behind.end(), padded.begin());
        const std::size_t ahead = std::min(length + radius, count - at);
        std::copy_n(values.begin() + static_cast<std::ptrdiff_t>(at), ahead,
                    padded.begin() + static_cast<std::ptrdiff_t>(radius));
        std::fill(padded.begin() + static_cast<std::ptrdiff_t>(radius + ahead), padded.end(), 0.0F);
        const float* centre = padded.data() + radius;
        for (std::size_t i = 0; i < length; ++i) {
            sums[i] = weights[0] * centre[i];
        }
        for (std::size_t k = 1; k <= radius; ++k) {
            const float weight = weights[k];
            const float* left = centre - k;
            const float* right = centre + k;
            for (std::size_t i = 0; i < length; ++i) {
                sums[i] += weight * (left[i] + right[i]);
            }
        }
        std::copy_n(padded.begin() + static_cast<std::ptrdiff_t>(length), radius, behind.begin());
        for (std::size_t i = 0; i < length; ++i) {
            const std::size_t to_start = at + i;
            const std::size_t to_end = count - 1 - to_start;
            if (to_start < radius || to_end < radius) {
                const double present = reach[std::min(to_start, radius)] + reach[std::min(to_end, radius)] - reach[0];
                sums[i] = static_cast<float>(static_cast<double>(sums[i]) / present);
            }
        }
        std::copy_n(sums.begin(), length, values.begin() + static_cast<std::ptrdiff_t>(at));
    }
}

Floor clipped_mean(std::span<const float> values, double clip_deviations, bool clip_again) {
    Floor floor{0.0, 0.0, values.size()};
    double ceiling = INFINITY;
    const int passes = clip_deviations <= 0.0 ? 1 : clip_again ? 50 : 2; // 50: a bound; it settles in about ten
    for (int pass = 0; pass < passes && !values.empty(); ++pass) {
        double sum = 0.0;
        for (const float value : values) {
            sum += std::min(static_cast<double>(value), ceiling);
        }
        const double mean = sum / static_cast<double>(values.size());
        double squares = 0.0;
        for (const float value : values) {
            const double off = std::min(static_cast<double>(value), ceiling) - mean;
            squares += off * off;
        }
        const double deviation = std::sqrt(squares / static_cast<double>(values.size()));
        const bool still = std::abs(deviation - floor.spread) <= 1e-6 * deviation;
        floor.centre = mean;
        floor.spread = deviation;
        ceiling = mean + clip_deviations * deviation;
        if (still) {
            break;
        }
    }
    return floor;
}

Floor median_and_quartile(std::span<float> values) {
    if (values.empty()) {
        return {};
    }
    const double median = partly_sorted_quantile(values, 0.5);
    return {median, partly_sorted_quantile(values, 0.75) - median, values.size()};
}

Ripples pick_ripples(std::span<const float> envelope, SampleIndex first, const Floor& floor,
                     const RefereeSettings& settings, Hertz rate) {
    const double edge = floor.centre + settings.edge_deviations * floor.spread;
    const double peak = floor.centre + settings.peak_deviations * floor.spread;
    Ripples events;
    std::size_t from = 0;
    while (from < envelope.size()) {
        std::size_t to = from;
        while (to < envelope.size() && static_cast<double>(envelope[to]) > edge) {
            ++to;
        }
        if (to > from) {
            const auto event = event_between(envelope, first, from, to);
            if (event.peak_envelope >= peak &&
                stays_above(envelope.subspan(from, to - from), peak, settings.min_above_peak_ms, rate)) {
                events.push_back(event);
            }
        }
        from = to + 1;
    }
    auto ripples = merged(events, settings.merge_gap_ms, rate);
    std::erase_if(ripples, [&](const Ripple& ripple) {
        return static_cast<double>(ripple.end - ripple.onset) * 1000.0 < settings.min_duration_ms * rate.value;
    });
    return ripples;
}

} // namespace millpond
