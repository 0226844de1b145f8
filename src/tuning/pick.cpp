#include "tuning/pick.hpp"

#include <algorithm>
#include <cmath>
#include <set>

namespace millpond {
namespace {

// Nobody runs a session at more false detections than this many times the limit asked for.
constexpr double usable_times_limit = 10.0;

bool at_most(double figure, double limit) noexcept {
    return figure <= limit; // not-a-number is not
}

/// Not-a-number comes last.
double latency_of(const SweepResult& result) noexcept {
    const double median = result.training.latency_median_ms;
    return std::isnan(median) ? INFINITY : median;
}

bool scored(const SweepResult& result) noexcept {
    return result.training.ripples > 0 && !std::isnan(result.training.false_per_minute);
}

double hit_rate(const SweepResult& result) noexcept {
    return result.training.hit_rate().share;
}

bool beats(const SweepResult& a, const SweepResult& b) noexcept {
    const double hits_a = hit_rate(a), hits_b = hit_rate(b);
    const double false_a = a.training.false_per_minute, false_b = b.training.false_per_minute;
    const bool no_worse = hits_a >= hits_b && false_a <= false_b && latency_of(a) <= latency_of(b);
    return no_worse && (hits_a > hits_b || false_a < false_b || latency_of(a) < latency_of(b));
}

bool equal(const SweepResult& a, const SweepResult& b) noexcept {
    return hit_rate(a) == hit_rate(b) && a.training.false_per_minute == b.training.false_per_minute &&
           latency_of(a) == latency_of(b);
}

bool on_front(std::span<const SweepResult> results, std::size_t place) noexcept {
    for (std::size_t other = 0; other < results.size(); ++other) {
        if (scored(results[other]) &&
            (beats(results[other], results[place]) || (other < place && equal(results[other], results[place])))) {
            return false;
        }
    }
    return scored(results[place]);
}

} // namespace

std::vector<std::size_t> ranking(std::span<const SweepResult> results, double max_false_per_minute) {
    std::vector<std::size_t> ranked;
    for (std::size_t i = 0; i < results.size(); ++i) {
        if (at_most(results[i].training.false_per_minute, max_false_per_minute) && results[i].training.ripples > 0) {
            ranked.push_back(i);
        }
    }
    std::stable_sort(ranked.begin(), ranked.end(), [&](std::size_t a, std::size_t b) {
        const auto& x = results[a];
        const auto& y = results[b];
        if (hit_rate(x) != hit_rate(y)) {
            return hit_rate(x) > hit_rate(y);
        }
        if (latency_of(x) != latency_of(y)) {
            return latency_of(x) < latency_of(y);
        }
        return x.training.false_per_minute < y.training.false_per_minute;
    });
    return ranked;
}

std::optional<Pick> pick(std::span<const SweepResult> results, double max_false_per_minute) {
    std::size_t passed_over = 0;
    for (const auto index : ranking(results, max_false_per_minute)) {
        if (at_most(results[index].held_out.false_per_minute, max_false_per_minute)) {
            return Pick{index, passed_over};
        }
        ++passed_over;
    }
    return std::nullopt;
}

std::vector<std::size_t> front(std::span<const SweepResult> results) {
    std::vector<std::size_t> places;
    for (std::size_t i = 0; i < results.size(); ++i) {
        if (on_front(results, i)) {
            places.push_back(i);
        }
    }
    std::stable_sort(places.begin(), places.end(), [&](std::size_t a, std::size_t b) {
        return results[a].training.false_per_minute < results[b].training.false_per_minute;
    });
    return places;
}

std::vector<std::size_t> finalists(std::span<const SweepResult> results, double max_false_per_minute,
                                   std::size_t most) {
    const auto ranked = ranking(results, max_false_per_minute);
    std::set<std::size_t> chosen(ranked.begin(),
                                 ranked.begin() + static_cast<std::ptrdiff_t>(std::min(most / 2, ranked.size())));
    std::vector<std::size_t> others;
    for (const auto place : front(results)) {
        if (chosen.count(place) == 0 &&
            results[place].training.false_per_minute <= usable_times_limit * max_false_per_minute) {
            others.push_back(place);
        }
    }
    const std::size_t room = std::min(most - chosen.size(), others.size());
    for (std::size_t i = 0; i < room; ++i) {
        chosen.insert(others[room == 1 ? 0 : i * (others.size() - 1) / (room - 1)]);
    }
    return {chosen.begin(), chosen.end()};
}

} // namespace millpond
