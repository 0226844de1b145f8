#include "sham/schedule.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

std::string such_places(std::uint64_t count) {
    return count == 1 ? "the only such place" : fmt::format("{} such places", count);
}

} // namespace

Crowding crowding(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate) {
    Crowding found;
    const auto lockout = frames_in_ms(limits.lockout_ms, rate);
    const auto second = frames_in_ms(1000.0, rate);
    std::size_t oldest = 0; // of those within the second that ends with place i
    for (std::size_t i = 0; i < schedule.size(); ++i) {
        while (schedule[i] - schedule[oldest] >= second) {
            ++oldest;
        }
        const std::uint64_t in_a_second = i - oldest + 1;
        found.most_in_a_second = std::max(found.most_in_a_second, in_a_second);
        if (in_a_second > limits.max_pulses_per_second && found.beyond_second++ == 0) {
            found.first_beyond_second = i;
        }
        if (i > 0 && schedule[i] - schedule[i - 1] < lockout && found.within_lockout++ == 0) {
            found.first_within_lockout = i;
        }
    }
    return found;
}

void check_schedule(const Schedule& schedule, const ScheduleLimits& limits, Hertz rate, const std::string& where) {
    const auto found = crowding(schedule, limits, rate);
    const auto place = [&](std::size_t i) {
        return fmt::format("{}: place {} at {:.4f} s", where, i + 1, seconds_at(schedule[i], rate));
    };
    if (found.within_lockout > 0) {
        const auto i = found.first_within_lockout;
        throw Refusal(place(i),
                      fmt::format("{:.1f} ms after the one before, {}",
                                  1000.0 * static_cast<double>(schedule[i] - schedule[i - 1]) / rate.value,
                                  such_places(found.within_lockout)),
                      fmt::format("at least the lock-out, {} ms", limits.lockout_ms));
    }
    if (found.beyond_second > 0) {
        throw Refusal(place(found.first_beyond_second),
                      fmt::format("one too many within one second, {}", such_places(found.beyond_second)),
                      fmt::format("{} a second", limits.max_pulses_per_second));
    }
    if (schedule.size() > limits.max_pulses_per_session) {
        throw Refusal(where, fmt::format("{} places", schedule.size()),
                      fmt::format("as many pulses as one session may have, {}", limits.max_pulses_per_session));
    }
}

double rate_per_s_of(const Schedule& places, Hertz rate, const std::string& where) {
    if (places.size() < 2 || places.front() == places.back()) {
        throw Refusal(where, fmt::format("{} of them", places.size()), "two or more, to take a rate from");
    }
    return static_cast<double>(places.size() - 1) /
           (seconds_at(places.back(), rate) - seconds_at(places.front(), rate));
}

std::vector<double> intervals_s_of(const Schedule& places, Hertz rate) {
    std::vector<double> intervals;
    for (std::size_t i = 1; i < places.size(); ++i) {
        intervals.push_back(static_cast<double>(places[i] - places[i - 1]) / rate.value);
    }
    return intervals;
}

} // namespace millpond
