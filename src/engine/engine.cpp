#include "engine/engine.hpp"

#include <algorithm>

namespace millpond {

Engine::Engine(Detector detector, const ArbiterSettings& arbiter, std::vector<SampleIndex> schedule, Hertz rate,
               EventSink& sink, PulsePort& port)
    : detector_(std::move(detector)), arbiter_(Arbiter::make(arbiter, rate)),
      plan_(PulsePlan::make(arbiter, rate, std::move(schedule))), sink_(sink), port_(port),
      second_frames_(frames_in_ms(1000.0, rate)) {
    if (detector_.has_state_gate()) {
        arbiter_.add_gate(std::string(state_gate_name), detector_.state_gate_open());
    }
    arbiter_.watch().expect_floors(detector_.floor_count());
}

void Engine::start(SampleIndex at, bool armed) noexcept {
    next_ = at;
    next_floor_ = at + second_frames_;
    detector_.gap(at);
    detector_.use_memory(arbiter_.gates_open());
    for (std::size_t i = 0; i < arbiter_.gate_count(); ++i) {
        journal_gate(arbiter_.gate_name(i), arbiter_.gate_open(i), {ChangeSource::settings});
    }
    if (arbiter_.plan().present()) {
        arbiter_.start_plan(at);
        sink_.take(Event::make(EventKind::epoch, 0, at, arbiter_.plan().detail({ChangeSource::plan})));
    }
    if (plan_.is_assigned()) {
        next_block_ = block_frames_ > 0 ? at : SampleIndex{UINT64_MAX};
        block_frames_ > 0 ? begin_blocks() : begin_unit();
    }
    set_state(armed ? ArmState::armed : ArmState::not_armed, StateCause::start);
}

void Engine::process(const FrameBlock& block, GapCause cause) noexcept {
    if (block.first > next_) {
        skip(block.first - next_, cause);
    }
    std::size_t used = 0;
    const std::size_t count = block.frames();
    while (used < count) {
        const auto rest = block.part(used, count - used);
        const std::size_t finite = detector_.finite_frames(rest);
        run_finite(rest.part(0, finite));
        used += finite;
        const std::size_t broken = broken_frames(block, used);
        if (broken > 0) {
            skip(broken, GapCause::non_finite);
            used += broken;
        }
    }
}

// Frames from `from` on that have a non-finite value: one gap, not one each.
std::size_t Engine::broken_frames(const FrameBlock& block, std::size_t from) const noexcept {
    std::size_t broken = 0;
    while (from + broken < block.frames() && detector_.finite_frames(block.part(from + broken, 1)) == 0) {
        ++broken;
    }
    return broken;
}

// Stops at every place where something is due by the clock of samples: an epoch, a slot, the floor's journal entry.
void Engine::run_finite(FrameBlock block) noexcept {
    if (block.frames() > 0) {
        close_gap();
        follow_watch();
    }
    while (block.frames() > 0) {
        const SampleIndex end = block.first + block.frames();
        follow_plan(next_);
        begin_blocks();
        while (plan_.next_due() <= next_) {
            meet_slot();
        }
        const SampleIndex stop =
            std::min({end, plan_.next_due(), next_floor_, next_block_, arbiter_.plan().next_start()});
        const std::size_t frames = run_detector(block.part(0, static_cast<std::size_t>(stop - block.first)));
        block = block.part(frames, block.frames() - frames);
        if (next_ >= next_floor_) {
            journal_floors();
        }
        follow_watch();
    }
}

// Epochs that are due up to `upto`, each at its own place.
void Engine::follow_plan(SampleIndex upto) noexcept {
    while (arbiter_.plan().next_start() <= upto) {
        begin_epoch(arbiter_.plan().next_start(), {ChangeSource::plan});
    }
}

void Engine::begin_epoch(SampleIndex at, const ChangedBy& by) noexcept {
    arbiter_.next_epoch(at);
    sink_.take(Event::make(EventKind::epoch, 0, at, arbiter_.plan().detail(by)));
}

void Engine::next_epoch(const ChangedBy& by) noexcept {
    if (arbiter_.plan().present() && !arbiter_.plan().over()) {
        begin_epoch(next_, by);
    }
}

// A session that is not armed has nothing to give up.
void Engine::follow_watch() noexcept {
    const auto cause = arbiter_.watch().take();
    if (cause && arbiter_.state() == ArmState::armed) {
        set_state(ArmState::faulted, *cause);
    }
}

std::size_t Engine::run_detector(const FrameBlock& block) noexcept {
    std::optional<Crossing> crossing;
    const std::size_t frames = detector_.run(block, crossing);
    next_ = next_ + frames;
    if (crossing) {
        on_crossing(*crossing);
    }
    while (const auto change = detector_.site_change()) {
        sink_.take(
            Event::make(EventKind::site, static_cast<std::uint8_t>(change->state), next_, SiteDetail{change->channel}));
    }
    follow_state();
    return frames;
}

void Engine::follow_state() noexcept {
    if (const auto open = detector_.state_gate_change()) {
        move_gate(state_gate_name, *open, {ChangeSource::lfp_state});
    }
}

void Engine::on_crossing(const Crossing& crossing) noexcept {
    ++detections_;
    // The verdict comes first and the pulse with it: what is written down can wait.
    const Rule rule = arbiter_.judge({crossing.at, crossing.settling, crossing.unsettled, crossing.vetoed});
    TriggerDetail detail{crossing.at.value, 0, PulseOrigin::trigger, 0, 0};
    bool ordered = false;
    if (rule == Rule::none) {
        detail.number = arbiter_.triggers();
        detail.caught = plan_.take_trigger(crossing.at, detail.number) ? 1 : 0;
        ordered = plan_.gives(PulseOrigin::trigger, crossing.at) && detail.caught == 0;
        const Event trigger = Event::make(EventKind::trigger, 0, crossing.at, detail);
        if (ordered) {
            port_.fire(order_event(crossing.at, detail));
        }
        port_.mark(trigger);
        detector_.blank(crossing.at + 1); // in every condition
    }
    sink_.take(Event::make(EventKind::detection, 0, crossing.at, crossing.detail));
    const auto verdict = rule == Rule::none ? EventKind::trigger : EventKind::withheld;
    sink_.take(Event::make(verdict, static_cast<std::uint8_t>(rule), crossing.at, detail));
    if (ordered) {
        sink_.take(order_event(crossing.at, detail));
    }
}

Event Engine::order_event(SampleIndex at, TriggerDetail detail) const noexcept {
    detail.condition = static_cast<std::uint32_t>(plan_.condition());
    return Event::make(EventKind::order, 0, at, detail);
}

void Engine::begin_unit() noexcept {
    const auto [number, listed] = plan_.begin_unit(next_);
    sink_.take(Event::make(EventKind::trial, 0, next_, TrialDetail{number, listed ? 1U : 0U}));
}

void Engine::begin_blocks() noexcept {
    for (; next_block_ <= next_; next_block_ = next_block_ + block_frames_) {
        begin_unit();
    }
}

// The moment of a delayed or scheduled pulse. All but the order is the same in every condition.
void Engine::meet_slot() noexcept {
    const PulseSlot slot = plan_.next();
    const TriggerDetail detail{slot.from.value, slot.number, slot.origin, slot.caught ? 1U : 0U, 0};
    Rule rule = Rule::held;
    if (!plan_.waits_for_quiet(slot.origin) || detector_.quiet_frames() >= plan_.quiet_frames()) {
        rule = arbiter_.judge_slot({next_, detector_.settling(), !detector_.settled()}, slot.origin);
    }
    const bool may_pass =
        rule == Rule::held || rule == Rule::lock_out || rule == Rule::second_limit || rule == Rule::interval;
    if (may_pass && plan_.hold(next_)) {
        return;
    }
    plan_.done();
    const bool ordered = rule == Rule::none && plan_.gives(slot, next_);
    const Event order = order_event(next_, detail);
    if (ordered) {
        port_.fire(order);
    }
    if (rule == Rule::none) {
        detector_.blank(next_);
    }
    const auto verdict = rule == Rule::none ? EventKind::slot : EventKind::omitted;
    sink_.take(Event::make(verdict, static_cast<std::uint8_t>(rule), next_, detail));
    if (ordered) {
        sink_.take(order);
    }
}

// Slots that fell into a gap are left out there, so that the plan's count stays whole.
void Engine::miss_slots(SampleIndex before) noexcept {
    for (; plan_.next_due() < before; plan_.done()) {
        const PulseSlot slot = plan_.next();
        const TriggerDetail detail{slot.from.value, slot.number, slot.origin, slot.caught ? 1U : 0U, 0};
        sink_.take(Event::make(EventKind::omitted, static_cast<std::uint8_t>(Rule::gap), slot.due, detail));
    }
}

void Engine::skip(std::uint64_t frames, GapCause cause) noexcept {
    if (gap_frames_ > 0 && gap_cause_ != cause) {
        close_gap();
    }
    if (gap_frames_ == 0) {
        gap_from_ = next_;
        gap_cause_ = cause;
    }
    gap_frames_ += frames;
    next_ = next_ + frames;
    detector_.gap(next_);
    follow_plan(next_);
    miss_slots(next_);
    // Floors stand still in a gap: those due in it are left out.
    if (next_ >= next_floor_) {
        next_floor_ = next_floor_ + ((next_ - next_floor_) / second_frames_ + 1) * second_frames_;
    }
}

void Engine::close_gap() noexcept {
    if (gap_frames_ > 0) {
        sink_.take(
            Event::make(EventKind::gap, static_cast<std::uint8_t>(gap_cause_), gap_from_, GapDetail{gap_frames_}));
        arbiter_.watch().gap(gap_from_, gap_frames_);
        gap_frames_ = 0;
    }
}

void Engine::journal_floors() noexcept {
    for (std::size_t i = 0; i < detector_.floor_count(); ++i) {
        const auto floor = detector_.floor(i);
        sink_.take(Event::make(EventKind::floor, 0, next_, floor));
        arbiter_.watch().floor(i, floor);
    }
    next_floor_ = next_ + second_frames_;
}

void Engine::set_state(ArmState state, StateCause cause, const ChangedBy& by) noexcept {
    StateDetail detail{static_cast<std::uint8_t>(arbiter_.state()), static_cast<std::uint8_t>(cause)};
    const bool told = by.source != ChangeSource::unknown;
    const auto source = cause == StateCause::start     ? ChangeSource::settings
                        : cause == StateCause::command ? ChangeSource::command
                                                       : ChangeSource::program;
    set_by(detail, told ? by : ChangedBy{source});
    arbiter_.set_state(state);
    sink_.take(Event::make(EventKind::state, static_cast<std::uint8_t>(state), next_, detail));
}

bool Engine::set_gate(std::string_view name, bool open, const ChangedBy& by) noexcept {
    const bool own = detector_.has_state_gate() && name == state_gate_name;
    const bool known = !own && arbiter_.has_gate(name);
    if (known) {
        move_gate(name, open, by);
    }
    return known;
}

void Engine::move_gate(std::string_view name, bool open, const ChangedBy& by) noexcept {
    arbiter_.set_gate(name, open);
    detector_.use_memory(arbiter_.gates_open());
    journal_gate(name, open, by);
}

void Engine::journal_gate(std::string_view name, bool open, const ChangedBy& by) noexcept {
    GateDetail detail{};
    detail.open = open ? 1 : 0;
    set_by(detail, by);
    std::copy_n(name.begin(), std::min(name.size(), detail.name.size() - 1), detail.name.begin());
    sink_.take(Event::make(EventKind::gate, 0, next_, detail));
}

void Engine::note(std::string_view text) noexcept {
    do {
        NoteDetail detail{};
        const std::size_t length = std::min(text.size(), detail.text.size());
        std::copy_n(text.begin(), length, detail.text.begin());
        text.remove_prefix(length);
        detail.length = static_cast<std::uint8_t>(length);
        detail.continues = text.empty() ? 0 : 1;
        sink_.take(Event::make(EventKind::note, 0, next_, detail));
    } while (!text.empty());
}

} // namespace millpond
