#include "sham/schedule.hpp"

#include "base/random.hpp"
#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

constexpr std::uint64_t schedule_stream = 0; // one plan draws one kind of number

double ms_of(std::uint64_t frames, Hertz rate) noexcept {
    return static_cast<double>(frames) * 1000.0 / rate.value;
}

// Takes places in order of their wishes and moves each one later until it is far enough from those before it.
class Placer {
  public:
    Placer(double min_interval_ms, std::uint32_t per_second, Hertz rate)
        : rate_(rate), min_interval_(frames_in_ms(min_interval_ms, rate)), second_(frames_in_ms(1000.0, rate)),
          per_second_(per_second) {}

    /// The first place from `wish` on that is far enough from those taken.
    [[nodiscard]] SampleIndex first_free(SampleIndex wish) const {
        SampleIndex at = wish;
        const auto& taken = made_.places;
        if (!taken.empty()) {
            at = std::max(at, taken.back() + std::max<std::uint64_t>(1, min_interval_));
        }
        if (taken.size() >= per_second_) {
            at = std::max(at, taken[taken.size() - per_second_] + second_);
        }
        return at;
    }

    void take(SampleIndex at, SampleIndex wish) {
        if (at > wish) {
            ++made_.put_off;
            made_.longest_put_off_ms = std::max(made_.longest_put_off_ms, ms_of(at - wish, rate_));
        }
        made_.places.push_back(at);
    }

    [[nodiscard]] MadeSchedule made() { return std::move(made_); }

  private:
    Hertz rate_;
    std::uint64_t min_interval_, second_;
    std::uint32_t per_second_;
    MadeSchedule made_;
};

struct Stretch {
    double from_s, to_s;
};

// The time from 0 to `duration_s` without the ripples and their surroundings.
std::vector<Stretch> time_left(const RateMatchedPlan& plan, Hertz rate) {
    std::vector<Stretch> left;
    double at = 0.0;
    for (const auto& ripple : plan.keep_away_from) {
        const double from = seconds_at(ripple.onset, rate) - plan.keep_away_ms / 1000.0;
        const double to = seconds_at(ripple.end + 1, rate) + plan.keep_away_ms / 1000.0;
        if (from > at) {
            left.push_back({at, std::min(from, plan.duration_s)});
        }
        at = std::max(at, to);
        if (at >= plan.duration_s) {
            break;
        }
    }
    if (at < plan.duration_s) {
        left.push_back({at, plan.duration_s});
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

MadeSchedule delayed_schedule(const Schedule& triggers, const DelayedPlan& plan, Hertz rate) {
    if (!(0.0 <= plan.least_ms && plan.least_ms <= plan.most_ms)) {
        throw Refusal("delay", fmt::format("{} to {} ms", plan.least_ms, plan.most_ms), "0 or more, least before most");
    }
    Random random(plan.seed, schedule_stream);
    Schedule wishes;
    for (const auto trigger : triggers) {
        const double share = plan.least_ms < plan.most_ms ? random.uniform() : 0.0;
        wishes.push_back(trigger + frames_in_ms(plan.least_ms + share * (plan.most_ms - plan.least_ms), rate));
    }
    std::sort(wishes.begin(), wishes.end()); // a short delay may overtake a long one
    Placer placer(plan.min_interval_ms, plan.max_pulses_per_second, rate);
    for (const auto wish : wishes) {
        placer.take(placer.first_free(wish), wish);
    }
    return placer.made();
}

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
    Random random(plan.seed, schedule_stream);
    Placer placer(plan.min_interval_ms, plan.max_pulses_per_second, rate);
    double at_s = 0.0;
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

double trigger_rate_per_s(const Schedule& triggers, Hertz rate, const std::string& where) {
    if (triggers.size() < 2 || triggers.front() == triggers.back()) {
        throw Refusal(where, fmt::format("{} triggers", triggers.size()), "two or more, to take a rate from");
    }
    return static_cast<double>(triggers.size() - 1) /
           (seconds_at(triggers.back(), rate) - seconds_at(triggers.front(), rate));
}

void check_schedule(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate, const std::string& where) {
    const auto lockout = frames_in_ms(limits.lockout_ms, rate);
    const auto second = frames_in_ms(1000.0, rate);
    const std::size_t most = limits.max_pulses_per_second;
    for (std::size_t i = 1; i < schedule.size(); ++i) {
        const auto place = fmt::format("{}: place {} at {:.4f} s", where, i + 1, seconds_at(schedule[i], rate));
        if (schedule[i] - schedule[i - 1] < lockout) {
            throw Refusal(place,
                          fmt::format("{:.1f} ms after the one before", ms_of(schedule[i] - schedule[i - 1], rate)),
                          fmt::format("at least the lock-out, {} ms", limits.lockout_ms));
        }
        if (i >= most && schedule[i] - schedule[i - most] < second) {
            throw Refusal(place, fmt::format("the {}. pulse within one second", most + 1),
                          fmt::format("{} a second", most));
        }
    }
}

} // namespace millpond
