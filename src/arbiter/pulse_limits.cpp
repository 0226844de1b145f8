#include "arbiter/pulse_limits.hpp"

#include <algorithm>

namespace millpond {

PulseLimits PulseLimits::make(const LimitsSettings& settings, double lockout_ms, Hertz rate) {
    PulseLimits limits;
    limits.lockout_frames_ = frames_in_ms(lockout_ms, rate);
    limits.interval_frames_ = frames_in_ms(settings.min_interval_ms, rate);
    limits.second_frames_ = frames_in_ms(1'000.0, rate);
    limits.minute_frames_ = frames_in_ms(60'000.0, rate);
    limits.per_second_ = settings.max_pulses_per_second;
    limits.per_minute_ = settings.max_pulses_per_minute;
    limits.per_epoch_ = settings.max_pulses_per_epoch;
    limits.per_session_ = settings.max_pulses_per_session;
    limits.recent_.resize(std::max(limits.per_second_, limits.per_minute_));
    return limits;
}

Rule PulseLimits::refusal(SampleIndex at) const noexcept {
    const std::uint64_t since = count_ > 0 ? at - recent_[(count_ - 1) % recent_.size()] : UINT64_MAX;
    if (since < lockout_frames_) {
        return Rule::lock_out;
    }
    if (within(at, per_second_, second_frames_)) {
        return Rule::second_limit;
    }
    if (count_ >= per_session_) {
        return Rule::session_limit;
    }
    if (within(at, per_minute_, minute_frames_)) {
        return Rule::minute_limit;
    }
    if (in_epoch_ >= per_epoch_) {
        return Rule::epoch_limit;
    }
    return since < interval_frames_ ? Rule::interval : Rule::none;
}

// Whether the last `most` triggers all lie within `frames` before `at`.
bool PulseLimits::within(SampleIndex at, std::uint32_t most, std::uint64_t frames) const noexcept {
    return count_ >= most && at - recent_[(count_ - most) % recent_.size()] < frames;
}

void PulseLimits::count(SampleIndex at) noexcept {
    recent_[count_ % recent_.size()] = at;
    ++count_;
    ++in_epoch_;
}

} // namespace millpond
