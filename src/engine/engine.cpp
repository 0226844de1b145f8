#include "engine/engine.hpp"

#include <algorithm>

namespace millpond {

Engine::Engine(Detector detector, Arbiter arbiter, Hertz rate, EventSink& sink, PulsePort& port)
    : detector_(std::move(detector)), arbiter_(std::move(arbiter)), sink_(sink), port_(port),
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

// Stops at every place where something is due by the clock of samples: an epoch, a scheduled pulse, the floor's journal
// entry.
void Engine::run_finite(FrameBlock block) noexcept {
    if (block.frames() > 0) {
        close_gap();
        follow_watch();
    }
    while (block.frames() > 0) {
        const SampleIndex end = block.first + block.frames();
        follow_plan(next_);
        const SampleIndex stop =
            std::min({end, std::max(next_ + 1, arbiter_.next_scheduled()), next_floor_, arbiter_.plan().next_start()});
        if (arbiter_.next_scheduled() <= next_) {
            play_schedule();
        }
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
    const Candidate candidate{crossing.at, crossing.settling, crossing.unsettled, crossing.vetoed, false};
    // The verdict comes first and the pulse with it: what is written down can wait.
    const Rule rule = arbiter_.judge(candidate);
    const Event trigger = trigger_event(candidate);
    if (rule == Rule::none) {
        port_.fire(trigger);
        detector_.blank(crossing.at + 1);
    }
    sink_.take(Event::make(EventKind::detection, 0, crossing.at, crossing.detail));
    sink_.take(rule == Rule::none ? trigger : withheld_event(candidate, rule));
}

void Engine::play_schedule() noexcept {
    const Candidate candidate{next_, detector_.settling(), !detector_.settled(), false, true};
    arbiter_.schedule_played();
    const Rule rule = arbiter_.judge(candidate);
    const Event trigger = trigger_event(candidate);
    if (rule == Rule::none) {
        port_.fire(trigger);
        detector_.blank(candidate.at);
    }
    sink_.take(rule == Rule::none ? trigger : withheld_event(candidate, rule));
}

Event Engine::trigger_event(const Candidate& candidate) const noexcept {
    return Event::make(EventKind::trigger, 0, candidate.at,
                       TriggerDetail{candidate.at.value, arbiter_.triggers(), candidate.scheduled ? 1U : 0U});
}

Event Engine::withheld_event(const Candidate& candidate, Rule rule) noexcept {
    return Event::make(EventKind::withheld, static_cast<std::uint8_t>(rule), candidate.at,
                       TriggerDetail{candidate.at.value, 0, candidate.scheduled ? 1U : 0U});
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
    // A place of the schedule that fell into the gap is refused there, so that the plan's count stays whole.
    while (arbiter_.next_scheduled() < next_) {
        const Candidate missed{arbiter_.next_scheduled(), true, false, false, true};
        arbiter_.schedule_played();
        sink_.take(withheld_event(missed, Rule::gap));
    }
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
