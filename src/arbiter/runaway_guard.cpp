#include "arbiter/runaway_guard.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

// P(X >= least) for X Poisson with this mean: terms from `least` on, which fall faster than a geometric series.
double poisson_tail(double mean, std::uint32_t least) {
    double log_term = -mean;
    for (std::uint32_t k = 1; k <= least; ++k) {
        log_term += std::log(mean / k);
    }
    double tail = 0.0;
    double term = std::exp(log_term);
    for (double k = least; term > tail * 1e-17 && k < 1e7; ++k) {
        tail += term;
        term *= mean / (k + 1.0);
    }
    return std::min(tail, 1.0);
}

bool withheld_for_its_number_alone(Rule rule) noexcept {
    return rule == Rule::second_limit || rule == Rule::minute_limit || rule == Rule::epoch_limit ||
           rule == Rule::session_limit || rule == Rule::interval;
}

} // namespace

std::uint32_t runaway_bound(double expected_per_s, double window_s, double false_alarms_per_hour) {
    const double mean = expected_per_s * window_s;
    // Below the mean the tail is no small number, so the search may begin there.
    auto most = static_cast<std::uint32_t>(mean) + 2;
    while (3600.0 * expected_per_s * poisson_tail(mean, most - 1) > false_alarms_per_hour) {
        ++most;
    }
    return most;
}

RunawayGuard RunawayGuard::make(const RunawaySettings& settings, Hertz rate) {
    RunawayGuard guard;
    guard.on_ = settings.on;
    guard.window_frames_ = frames_in_ms(settings.window_s * 1000.0, rate);
    guard.within_frames_ = frames_in_ms(settings.equal_within_ms, rate);
    guard.below_frames_ = frames_in_ms(settings.equal_below_ms, rate);
    guard.seen_.resize(runaway_bound(settings.expected_per_s, settings.window_s, settings.false_alarms_per_hour));
    guard.intervals_.resize(settings.equal_intervals);
    return guard;
}

bool RunawayGuard::judged(SampleIndex at, Rule rule) noexcept {
    if (!on_ || (rule != Rule::none && !withheld_for_its_number_alone(rule))) {
        return false;
    }
    const bool many = too_many(at);
    const bool equal = rule == Rule::none && too_equal(at);
    return many || equal;
}

bool RunawayGuard::too_many(SampleIndex at) noexcept {
    seen_[seen_count_ % seen_.size()] = at;
    ++seen_count_;
    // The place after the newest holds the oldest.
    return seen_count_ >= seen_.size() && at - seen_[seen_count_ % seen_.size()] < window_frames_;
}

bool RunawayGuard::too_equal(SampleIndex at) noexcept {
    const std::uint64_t interval = any_ ? at - newest_ : UINT64_MAX;
    newest_ = at;
    any_ = true;
    if (interval >= below_frames_) {
        interval_count_ = 0;
        return false;
    }
    intervals_[interval_count_ % intervals_.size()] = interval;
    ++interval_count_;
    if (interval_count_ < intervals_.size()) {
        return false;
    }
    const auto [least, most] = std::minmax_element(intervals_.begin(), intervals_.end());
    return *most - *least <= within_frames_;
}

void RunawayGuard::reset() noexcept {
    seen_count_ = 0;
    interval_count_ = 0;
    any_ = false;
}

} // namespace millpond
