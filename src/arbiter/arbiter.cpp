#include "arbiter/arbiter.hpp"

#include <algorithm>

namespace millpond {

Arbiter Arbiter::make(const ArbiterSettings& settings, Hertz rate) {
    Arbiter arbiter;
    for (const auto& gate : settings.gates) {
        arbiter.gates_.push_back({gate.name, gate.starts_open});
    }
    if (settings.speed_gate.on) {
        arbiter.add_gate(speed_gate_name, false); // no speed has come yet
    }
    arbiter.limits_.fill(PulseLimits::make(settings.limits, settings.lockout_ms, rate));
    arbiter.watch_ = FaultWatch::make(settings.limits, rate);
    arbiter.plan_ = SessionPlan::make(settings.plan, rate);
    return arbiter;
}

Rule Arbiter::judge(const Candidate& detection) noexcept {
    const Rule rule = judge(detection, of(PulseOrigin::trigger));
    watch_.judged(detection.at, rule);
    return rule;
}

Rule Arbiter::judge_slot(const Candidate& moment, PulseOrigin origin) noexcept {
    return judge(moment, of(origin));
}

Rule Arbiter::judge(const Candidate& candidate, PulseLimits& limits) noexcept {
    const Rule rule = refusal(candidate, limits);
    if (rule == Rule::none) {
        limits.count(candidate.at);
    }
    return rule;
}

Rule Arbiter::refusal(const Candidate& candidate, const PulseLimits& limits) const noexcept {
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
    return gates_open() && plan_.pulses() ? limits.refusal(candidate.at) : Rule::gate;
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
