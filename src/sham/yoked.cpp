#include "sham/yoked.hpp"

#include "base/random.hpp"
#include "base/refusal.hpp"
#include "sham/placer.hpp"

#include <fmt/format.h>

#include <cmath>

namespace millpond {
namespace {

constexpr std::uint64_t delays_stream = 0; // of base/random.hpp

std::uint64_t frames_in_s(double seconds, Hertz rate) {
    return static_cast<std::uint64_t>(std::llround(seconds * rate.value));
}

// Puts places off where a delay brought them too near to each other.
MadeSchedule placed(Schedule wishes, const YokedPlan& plan, Hertz rate) {
    std::sort(wishes.begin(), wishes.end()); // a short delay may overtake a long one
    Placer placer(plan.min_interval_ms, plan.max_pulses_per_second, plan.max_pulses_per_minute, rate);
    for (const auto wish : wishes) {
        placer.take(placer.first_free(wish), wish);
    }
    return placer.made();
}

} // namespace

YokedSchedule yoked_schedule(const Schedule& source, const YokedPlan& plan, Hertz rate) {
    if (!(0.0 <= plan.least_delay_ms && plan.least_delay_ms <= plan.most_delay_ms)) {
        throw Refusal("delay", fmt::format("{} to {} ms", plan.least_delay_ms, plan.most_delay_ms),
                      "0 or more, least before most");
    }
    YokedSchedule made;
    Random random(plan.seed, delays_stream);
    Schedule wishes;
    const SampleIndex start{frames_in_s(plan.start_s, rate)};
    for (const auto place : source) {
        if (place < plan.moment) {
            ++made.before;
            continue;
        }
        const double share = plan.least_delay_ms < plan.most_delay_ms ? random.uniform() : 0.0;
        const double delay_ms = plan.least_delay_ms + share * (plan.most_delay_ms - plan.least_delay_ms);
        wishes.push_back(start + (place - plan.moment) + frames_in_ms(delay_ms, rate));
    }
    if (plan.most_delay_ms > 0.0) {
        static_cast<MadeSchedule&>(made) = placed(std::move(wishes), plan, rate);
    } else {
        made.places = std::move(wishes);
    }
    if (plan.duration_s > 0.0) {
        const auto end = start + frames_in_s(plan.duration_s, rate);
        made.after = std::erase_if(made.places, [&](SampleIndex place) { return place >= end; });
    }
    return made;
}

} // namespace millpond
