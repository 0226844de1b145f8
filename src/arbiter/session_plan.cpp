#include "arbiter/session_plan.hpp"

#include <algorithm>
#include <string_view>

namespace millpond {

SessionPlan SessionPlan::make(const PlanSettings& settings, Hertz rate) {
    SessionPlan plan;
    for (const auto& epoch : settings.epochs) {
        const auto frames = frames_in_ms(epoch.minutes * 60'000.0, rate);
        plan.epochs_.push_back(
            {epoch.name, epoch.minutes > 0.0 ? std::max<std::uint64_t>(1, frames) : 0, epoch.pulses});
    }
    plan.ends_session_ = settings.ends_session;
    return plan;
}

void SessionPlan::start(SampleIndex at) noexcept {
    now_ = 0;
    begin(at);
}

void SessionPlan::next(SampleIndex at) noexcept {
    if (now_ < epochs_.size()) {
        ++now_;
        begin(at);
    }
}

void SessionPlan::begin(SampleIndex at) noexcept {
    const bool timed = now_ < epochs_.size() && epochs_[now_].frames > 0;
    next_start_ = timed ? at + epochs_[now_].frames : SampleIndex{UINT64_MAX};
}

EpochDetail SessionPlan::detail(const ChangedBy& by) const noexcept {
    EpochDetail detail{};
    const std::string_view name = over() ? std::string_view(after_plan_name) : std::string_view(epochs_[now_].name);
    detail.frames = over() ? 0 : epochs_[now_].frames;
    detail.index = static_cast<std::uint16_t>(now_);
    detail.pulses = pulses() ? 1 : 0;
    std::copy_n(name.begin(), std::min(name.size(), detail.name.size() - 1), detail.name.begin());
    set_by(detail, by);
    return detail;
}

} // namespace millpond
