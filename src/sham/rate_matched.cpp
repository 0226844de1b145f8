#include "sham/rate_matched.hpp"

#include "base/random.hpp"
#include "base/refusal.hpp"
#include "sham/placer.hpp"

#include <fmt/format.h>

#include <cmath>

namespace millpond {
namespace {

constexpr std::uint64_t places_stream = 0; // of base/random.hpp

struct Stretch {
    double from_s, to_s;
};

// The schedule's time without the ripples and their surroundings.
std::vector<Stretch> time_left(const RateMatchedPlan& plan, Hertz rate) {
    std::vector<Stretch> left;
    double at = plan.start_s;
    const double end = plan.start_s + plan.duration_s;
    for (const auto& ripple : plan.keep_away_from) {
        const double from = seconds_at(ripple.onset, rate) - plan.keep_away_ms / 1000.0;
        const double to = seconds_at(ripple.end + 1, rate) + plan.keep_away_ms / 1000.0;
        if (from > at) {
            left.push_back({at, std::min(from, end)});
        }
        at = std::max(at, to);
        if (at >= end) {
            break;
        }
    }
    if (at < end) {
        left.push_back({at, end});
    }
    return left;
}

double length_of(const std::vector<Stretch>& stretches) {
    double length = 0.0;
    for (const auto& stretch : stretches) {
        length += stretch.to_s - stretch.from_s;
    }
    return length;
}

// Walks on by `step_s` of the time that is left; false where it ends before.
bool walk(const std::vector<Stretch>& left, std::size_t& stretch, double& at_s, double step_s) {
    while (stretch < left.size()) {
        at_s = std::max(at_s, left[stretch].from_s);
        if (at_s + step_s < left[stretch].to_s) {
            at_s += step_s;
            return true;
        }
        step_s -= std::max(0.0, left[stretch].to_s - at_s);
        ++stretch;
    }
    return false;
}

} // namespace

MadeSchedule rate_matched_schedule(const RateMatchedPlan& plan, Hertz rate) {
    const auto left = time_left(plan, rate);
    const double mean_s = length_of(left) / (plan.rate_per_s * plan.duration_s);
    const double rest_s = mean_s - plan.min_interval_ms / 1000.0;
    if (!(rest_s > 0.0)) {
        throw Refusal("rate",
                      fmt::format("{:.3f} pulses a second, one every {:.3f} s of {:.1f} s left for them",
                                  plan.rate_per_s, mean_s, length_of(left)),
                      fmt::format("a mean interval above the minimum interval, {} s", plan.min_interval_ms / 1000.0));
    }
    if (plan.rate_per_s * 60.0 > plan.max_pulses_per_minute) {
        throw Refusal("rate",
                      fmt::format("{:.3f} pulses a second, {:.0f} a minute", plan.rate_per_s, plan.rate_per_s * 60.0),
                      fmt::format("at most {} a minute", plan.max_pulses_per_minute));
    }
    Random random(plan.seed, places_stream);
    Placer placer(plan.min_interval_ms, plan.max_pulses_per_second, plan.max_pulses_per_minute, rate);
    double at_s = plan.start_s;
    std::size_t stretch = 0;
    while (walk(left, stretch, at_s, plan.min_interval_ms / 1000.0 + random.exponential(rest_s))) {
        const SampleIndex wish{static_cast<std::uint64_t>(std::llround(at_s * rate.value))};
        SampleIndex at = placer.first_free(wish);
        if (at > wish) {
            at_s = seconds_at(at, rate);
            if (!walk(left, stretch, at_s, 0.0)) { // out of a ripple that it was put off into
                break;
            }
            at = SampleIndex{static_cast<std::uint64_t>(std::ceil(at_s * rate.value))};
        }
        placer.take(at, wish);
    }
    return placer.made();
}

} // namespace millpond
