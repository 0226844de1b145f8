#include "arbiter/stream_watch.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {

GapWatch GapWatch::make(const LimitsSettings& settings, Hertz rate) {
    GapWatch watch;
    watch.second_frames_ = std::max<std::uint64_t>(1, frames_in_ms(1'000.0, rate));
    watch.most_gaps_ = settings.max_gaps_per_minute == 0 ? UINT64_MAX : settings.max_gaps_per_minute;
    const double minute = static_cast<double>(frames_in_ms(60'000.0, rate));
    watch.most_lost_ = settings.max_lost_percent >= 100.0
                           ? UINT64_MAX
                           : static_cast<std::uint64_t>(std::floor(minute * settings.max_lost_percent / 100.0));
    return watch;
}

// Seconds that were skipped over are empty.
GapWatch::Second& GapWatch::second(std::uint64_t number) noexcept {
    if (number > newest_ + seconds_.size()) {
        newest_ = number - seconds_.size();
    }
    while (newest_ < number) {
        seconds_[++newest_ % seconds_.size()] = {};
    }
    return seconds_[number % seconds_.size()];
}

bool GapWatch::gap(SampleIndex from, std::uint64_t frames) noexcept {
    ++second(from.value / second_frames_).gaps;
    const std::uint64_t most = seconds_.size() * second_frames_; // older ones would be forgotten by the end
    std::uint64_t at = frames > most ? from.value + frames - most : from.value;
    const std::uint64_t end = from.value + frames;
    while (at < end) {
        const std::uint64_t number = at / second_frames_;
        const std::uint64_t here = std::min(end, (number + 1) * second_frames_) - at;
        second(number).lost += here;
        at += here;
    }
    std::uint64_t gaps = 0, lost = 0;
    for (const auto& each : seconds_) {
        gaps += each.gaps;
        lost += each.lost;
    }
    return gaps > most_gaps_ || lost > most_lost_;
}

void GapWatch::reset() noexcept {
    seconds_ = {};
}

FloorWatch FloorWatch::make(const FloorLimitSettings& settings) {
    FloorWatch watch;
    watch.settings_ = settings;
    return watch;
}

bool FloorWatch::floor(std::size_t i, const FloorDetail& floor) noexcept {
    if (floor.settled == 0 || i >= settled_at_.size()) {
        return false;
    }
    auto& reference = settled_at_[i][floor.gates_closed != 0 ? 1 : 0];
    if (!(reference > 0.0)) {
        reference = floor.deviation;
    }
    const std::uint32_t channel = floor.site == 65535 ? 0U : floor.site + 1U;
    double least = settings_.least_uv, most = settings_.most_uv;
    for (const auto& range : settings_.channels) {
        if (range.channel == channel) {
            least = range.least_uv;
            most = range.most_uv;
        }
    }
    least = std::max(least, settings_.least_times * reference);
    most = std::min(most, settings_.most_times * reference);
    return !(floor.deviation >= least && floor.deviation <= most);
}

} // namespace millpond
