#include "arbiter/arbiter.hpp"

#include <algorithm>

namespace millpond {

Arbiter Arbiter::make(const ArbiterSettings& settings, Hertz rate, std::vector<SampleIndex> schedule) {
    Arbiter arbiter;
    arbiter.condition_ = settings.condition;
    for (const auto& gate : settings.gates) {
        arbiter.gates_.push_back({gate.name, gate.starts_open});
    }
    if (settings.speed_gate.on) {
        arbiter.add_gate(speed_gate_name, false); // no speed has come yet
    }
    arbiter.schedule_ = std::move(schedule);
    arbiter.limits_ = PulseLimits::make(settings.limits, settings.lockout_ms, rate);
    arbiter.watch_ = FaultWatch::make(settings.limits, rate);
    arbiter.plan_ = SessionPlan::make(settings.plan, rate);
    return arbiter;
}

Rule Arbiter::judge(const Candidate& candidate) noexcept {
    const Rule rule = refusal(candidate);
    if (rule == Rule::none) {
        limits_.count(candidate.at);
    }
    if (!candidate.scheduled) { // a schedule cannot run away
        watch_.judged(candidate.at, rule);
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
    if (!gates_open() || !plan_.pulses()) {
        return Rule::gate;
    }
    if ((condition_ == Condition::schedule) != candidate.scheduled || condition_ == Condition::none) {
        return Rule::condition;
    }
    return limits_.refusal(candidate.at);
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
