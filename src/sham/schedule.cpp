#include "sham/schedule.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

std::string such_places(std::uint64_t count) {
    return count == 1 ? "the only such place" : fmt::format("{} such places", count);
}

/// Most places within any stretch so long that ends with a place.
std::uint64_t most_within(const Schedule& schedule, std::uint64_t frames) {
    std::uint64_t most = 0;
    std::size_t oldest = 0;
    for (std::size_t i = 0; i < schedule.size(); ++i) {
        while (schedule[i] - schedule[oldest] >= frames) {
            ++oldest;
        }
        most = std::max<std::uint64_t>(most, i - oldest + 1);
    }
    return most;
}

/// Most places within an epoch; before the first epoch and without a plan there is one.
std::uint64_t most_in_epochs(const Schedule& schedule, const std::vector<double>& starts_s, Hertz rate) {
    std::vector<std::uint64_t> counts(starts_s.size() + 1, 0);
    for (const auto place : schedule) {
        const auto after = std::upper_bound(starts_s.begin(), starts_s.end(), seconds_at(place, rate));
        ++counts[static_cast<std::size_t>(after - starts_s.begin())];
    }
    return *std::max_element(counts.begin(), counts.end());
}

void check_most(std::uint64_t found, std::uint64_t allowed, const char* within, const std::string& where) {
    if (found > allowed) {
        throw Refusal(where, fmt::format("{} places within one {}", found, within),
                      fmt::format("as many pulses as one {} may have, {}", within, allowed));
    }
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
    found.most_in_a_minute = most_within(schedule, frames_in_ms(60'000.0, rate));
    found.most_in_an_epoch = most_in_epochs(schedule, limits.epoch_starts_s, rate);
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
    check_most(found.most_in_a_minute, limits.max_pulses_per_minute, "minute", where);
    check_most(found.most_in_an_epoch, limits.max_pulses_per_epoch, "epoch", where);
    check_most(schedule.size(), limits.max_pulses_per_session, "session", where);
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
