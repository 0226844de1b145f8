#include "arbiter/arbiter.hpp"

#include <algorithm>

namespace millpond {

Arbiter Arbiter::make(const ArbiterSettings& settings, Hertz rate, std::vector<SampleIndex> schedule) {
    Arbiter arbiter;
    arbiter.condition_ = settings.condition;
    for (const auto& gate : settings.gates) {
        arbiter.gates_.push_back({gate.name, gate.starts_open});
    }
    arbiter.schedule_ = std::move(schedule);
    arbiter.lockout_frames_ = frames_in_ms(settings.lockout_ms, rate);
    arbiter.second_frames_ = frames_in_ms(1000.0, rate);
    arbiter.session_limit_ = settings.max_pulses_per_session;
    arbiter.recent_.resize(settings.max_pulses_per_second);
    return arbiter;
}

Rule Arbiter::judge(const Candidate& candidate) noexcept {
    const Rule rule = refusal(candidate);
    if (rule == Rule::none) {
        recent_[triggers_ % recent_.size()] = candidate.at;
        ++triggers_;
    }
    return rule;
}

Rule Arbiter::refusal(const Candidate& candidate) const noexcept {
    if (candidate.settling) {
        return Rule::gap;
    }
    if (candidate.unsettled) {
        return Rule::unsettled;
    }
    if (candidate.vetoed) {
        return Rule::veto;
    }
    if (state_ == ArmState::faulted) {
        return Rule::faulted;
    }
    if (state_ == ArmState::not_armed) {
        return Rule::not_armed;
    }
    if (!gates_open()) {
        return Rule::gate;
    }
    if ((condition_ == Condition::schedule) != candidate.scheduled || condition_ == Condition::none) {
        return Rule::condition;
    }
    return limit(candidate.at);
}

Rule Arbiter::limit(SampleIndex at) const noexcept {
    if (triggers_ > 0 && at - newest() < lockout_frames_) {
        return Rule::lock_out;
    }
    // The oldest of the last N triggers stands where the next one would be kept.
    if (triggers_ >= recent_.size() && at - recent_[triggers_ % recent_.size()] < second_frames_) {
        return Rule::second_limit;
    }
    return triggers_ >= session_limit_ ? Rule::session_limit : Rule::none;
}

SampleIndex Arbiter::newest() const noexcept {
    return recent_[(triggers_ - 1) % recent_.size()];
}

SampleIndex Arbiter::next_scheduled() const noexcept {
    return next_in_schedule_ < schedule_.size() ? schedule_[next_in_schedule_] : SampleIndex{UINT64_MAX};
}

void Arbiter::schedule_played() noexcept {
    ++next_in_schedule_;
}

bool Arbiter::set_gate(std::string_view name, bool open) noexcept {
    const auto gate = std::find_if(gates_.begin(), gates_.end(), [&](const auto& each) { return each.name == name; });
    if (gate == gates_.end()) {
        return false;
    }
    gate->open = open;
    return true;
}

bool Arbiter::has_gate(std::string_view name) const noexcept {
    return std::any_of(gates_.begin(), gates_.end(), [&](const auto& gate) { return gate.name == name; });
}

bool Arbiter::gates_open() const noexcept {
    return std::all_of(gates_.begin(), gates_.end(), [](const auto& gate) { return gate.open; });
}

} // namespace millpond
