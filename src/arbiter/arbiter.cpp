#include "arbiter/arbiter.hpp"

#include <algorithm>

namespace millpond {

Arbiter Arbiter::make(const ArbiterSettings& settings, Hertz rate) {
    Arbiter arbiter;
    for (const auto& gate : settings.gates) {
        arbiter.gates_.push_back({gate.name, gate.starts_open});
    }
    arbiter.lockout_frames_ = frames_in_ms(settings.lockout_ms, rate);
    arbiter.second_frames_ = frames_in_ms(1000.0, rate);
    arbiter.session_limit_ = settings.max_pulses_per_session;
    for (auto& counted : arbiter.counted_) {
        counted.recent.resize(settings.max_pulses_per_second);
    }
    return arbiter;
}

Rule Arbiter::judge(const Candidate& detection) noexcept {
    return judge(detection, of(PulseOrigin::trigger));
}

Rule Arbiter::judge_slot(const Candidate& moment, PulseOrigin origin) noexcept {
    return judge(moment, of(origin));
}

Rule Arbiter::judge(const Candidate& candidate, Counted& counted) noexcept {
    const Rule rule = refusal(candidate, counted);
    if (rule == Rule::none) {
        counted.recent[counted.count % counted.recent.size()] = candidate.at;
        ++counted.count;
    }
    return rule;
}

Rule Arbiter::refusal(const Candidate& candidate, const Counted& counted) const noexcept {
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
    return gates_open() ? limit(candidate.at, counted) : Rule::gate;
}

Rule Arbiter::limit(SampleIndex at, const Counted& counted) const noexcept {
    const auto& recent = counted.recent;
    if (counted.count > 0 && at - recent[(counted.count - 1) % recent.size()] < lockout_frames_) {
        return Rule::lock_out;
    }
    // The oldest of the last N stands where the next one would be kept.
    if (counted.count >= recent.size() && at - recent[counted.count % recent.size()] < second_frames_) {
        return Rule::second_limit;
    }
    return counted.count >= session_limit_ ? Rule::session_limit : Rule::none;
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
