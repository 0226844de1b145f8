#include "arbiter/pulse_plan.hpp"

#include <algorithm>

namespace millpond {
namespace {

constexpr std::uint64_t draws_stream = 0x706c616e; // of base/random.hpp
constexpr SampleIndex never{UINT64_MAX};
// How often a held slot looks again.
constexpr double hold_step_ms = 1.0;

} // namespace

PulsePlan PulsePlan::make(const ArbiterSettings& settings, Hertz rate, std::vector<SampleIndex> schedule) {
    PulsePlan plan;
    plan.condition_ = settings.condition;
    plan.draws_ = Random(settings.seed, draws_stream);
    plan.catch_share_ = settings.catch_share;
    plan.has_delays_ = settings.condition == Condition::delayed || settings.delay.in_every_condition;
    plan.least_delay_ = frames_in_ms(settings.delay.least_ms, rate);
    plan.delay_span_ = frames_in_ms(settings.delay.most_ms, rate) - plan.least_delay_;
    plan.schedule_waits_ = settings.hold.schedule;
    plan.quiet_frames_ = frames_in_ms(settings.hold.quiet_ms, rate);
    plan.hold_step_ = frames_in_ms(hold_step_ms, rate);
    plan.longest_hold_ = frames_in_ms(settings.hold.longest_ms, rate);
    plan.lockout_frames_ = frames_in_ms(settings.lockout_ms, rate);
    plan.pending_.reserve(most_delayed_slots);
    plan.schedule_ = std::move(schedule);
    return plan;
}

bool PulsePlan::take_trigger(SampleIndex at, std::uint32_t number) noexcept {
    // Both are drawn for every trigger, so that the draws do not depend on the settings of the other.
    const bool caught = draws_.uniform() < catch_share_;
    const double place = draws_.uniform();
    if (has_delays_ && pending_.size() < pending_.capacity()) {
        const auto delay = least_delay_ + static_cast<std::uint64_t>(place * static_cast<double>(delay_span_ + 1));
        const PulseSlot slot{at + delay, at + delay, at, number, PulseOrigin::delay, caught, units_begun_};
        const auto after = std::find_if(pending_.begin(), pending_.end(),
                                        [&](const PulseSlot& other) { return other.due > slot.due; });
        pending_.insert(after, slot);
    }
    return caught;
}

PulseSlot PulsePlan::next_of_schedule() const noexcept {
    if (next_place_ >= schedule_.size()) {
        return {never, never, never, 0, PulseOrigin::schedule, false, units_begun_};
    }
    const SampleIndex place = schedule_[next_place_];
    const auto number = static_cast<std::uint32_t>(next_place_ + 1);
    return {place_due_ == never ? place : place_due_, place, place, number, PulseOrigin::schedule, false, units_begun_};
}

bool PulsePlan::schedule_first() const noexcept {
    return pending_.empty() || next_of_schedule().due < pending_.front().due;
}

SampleIndex PulsePlan::next_due() const noexcept {
    return next().due;
}

PulseSlot PulsePlan::next() const noexcept {
    return schedule_first() ? next_of_schedule() : pending_.front();
}

bool PulsePlan::hold(SampleIndex now) noexcept {
    const PulseSlot slot = next();
    if (now + hold_step_ > slot.planned + longest_hold_) {
        return false;
    }
    if (schedule_first()) {
        place_due_ = now + hold_step_;
        return true;
    }
    auto held = pending_.begin();
    held->due = now + hold_step_;
    // Keeps the order: others may be due before it is looked at again.
    for (auto after = held + 1; after != pending_.end() && after->due < held->due; ++after, ++held) {
        std::swap(*held, *after);
    }
    return true;
}

void PulsePlan::done() noexcept {
    if (schedule_first()) {
        ++next_place_;
        place_due_ = never;
    } else {
        pending_.erase(pending_.begin());
    }
}

std::pair<std::uint32_t, bool> PulsePlan::begin_unit(SampleIndex at) noexcept {
    pause_until_ = units_begun_ > 0 ? at + lockout_frames_ : at;
    const bool listed = units_begun_ < assigned_.size();
    condition_ = listed ? assigned_[units_begun_] : Condition::none;
    return {++units_begun_, listed};
}

bool PulsePlan::gives(const PulseSlot& slot, SampleIndex now) const noexcept {
    return gives(slot.origin, now) && slot.unit == units_begun_ && !slot.caught;
}

bool PulsePlan::gives(PulseOrigin origin, SampleIndex now) const noexcept {
    if (now < pause_until_) {
        return false;
    }
    switch (condition_) {
    case Condition::disrupt:
        return origin == PulseOrigin::trigger;
    case Condition::delayed:
        return origin == PulseOrigin::delay;
    case Condition::yoked:
    case Condition::rate_matched:
        return origin == PulseOrigin::schedule;
    case Condition::none:
    case Condition::assigned: // and none has begun
        return false;
    }
    return false;
}

} // namespace millpond
