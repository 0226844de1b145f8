#include "live/live_loop.hpp"

#include "base/clock.hpp"

namespace millpond {
namespace {

// How long a quiet loop sleeps before it looks for commands and trouble again.
constexpr Nanos patience{5'000'000};
// Packet counts go to the journal this often even when nothing but `accepted` grows.
constexpr std::uint64_t packets_between_counts = 1024;

} // namespace

void LiveLoop::run() noexcept {
    engine_.start(SampleIndex{0}, settings_.start_armed);
    for (bool going = true; going && !stopping_.load(std::memory_order_relaxed);) {
        Arrival arrival;
        const auto received = source_.receive(settings_.spin ? Nanos{0} : patience, arrival);
        const Nanos began = monotonic_now();
        take_stop();
        take_commands();
        follow_speed(began);
        look_for_trouble();
        if (received == Received::frames) {
            on_frames(arrival, began);
        } else {
            on_silence();
        }
        going = keep_on(received);
    }
    engine_.finish();
    engine_.set_state(ArmState::not_armed, StateCause::session_end);
    lines_.fall_now();
    journal_counts();
    auto running = LoopEnd::running;
    end_.compare_exchange_strong(running, LoopEnd::stopped, std::memory_order_release);
}

bool LiveLoop::keep_on(Received received) noexcept {
    if (received == Received::ended || received == Received::failed) {
        end_.store(received == Received::ended ? LoopEnd::ended : LoopEnd::failed, std::memory_order_release);
        return false;
    }
    if (engine_.arbiter().plan().ends_session()) {
        end_.store(LoopEnd::planned, std::memory_order_release);
        return false;
    }
    return true;
}

void LiveLoop::on_frames(const Arrival& arrival, Nanos began) noexcept {
    arrival_ = &arrival;
    began_ = began;
    last_frames_ = began;
    stale_ = false;
    // Both stamps are UTC by this computer's clock; `began` was read a moment ago by the other clock.
    const std::int64_t begun_utc = (realtime_now() - (monotonic_now() - began)).count();
    wake_ns_ = arrival.arrived_ns != 0 ? begun_utc - arrival.arrived_ns : PulseDetail::not_measured;
    transport_ns_ = arrival.arrived_ns != 0 && arrival.sent_ns != 0 ? arrival.arrived_ns - arrival.sent_ns
                                                                    : PulseDetail::not_measured;
    const auto before = engine_.arbiter().state();
    engine_.process(arrival.block, arrival.gap_cause);
    if (engine_.arbiter().state() == ArmState::faulted && before != ArmState::faulted) {
        lines_.fall_now(); // a limit was passed
    }
    const std::int64_t worked_ns = (monotonic_now() - began).count();
    // Stored after the pulse: copying the block must not make it late.
    journal_.store(arrival.block);
    journal_.time_packet(transport_ns_, wake_ns_,
                         wake_ns_ == PulseDetail::not_measured ? PulseDetail::not_measured : wake_ns_ + worked_ns);
    if (++packets_ % packets_between_counts == 0 || arrival.counts_changed) {
        journal_counts();
    }
    if (output_failed_) {
        output_failed_ = false;
        engine_.set_state(ArmState::faulted, StateCause::output_failed);
        lines_.fall_now();
    }
}

void LiveLoop::fire(const Event& order) noexcept {
    if (stop_.stopped()) {
        return; // between the stop and the place where it is journaled
    }
    const Nanos decided = monotonic_now();
    if (!lines_.rise(Follows::pulse, order.sample, static_cast<std::uint8_t>(order.as<TriggerDetail>().condition))) {
        output_failed_ = true;
    }
    if (stop_.stopped()) {
        lines_.fall_now(); // it came while the line was being raised
    }
    const Nanos written = monotonic_now();
    const double frames_after =
        static_cast<double>(arrival_->block.first + arrival_->block.frames() - order.sample - 1);
    PulseDetail detail{};
    detail.packing_ns = static_cast<std::int64_t>(frames_after / source_.rate().value * 1e9);
    detail.transport_ns = transport_ns_;
    detail.wake_ns = wake_ns_;
    detail.compute_ns = (decided - began_).count();
    detail.output_ns = (written - decided).count();
    journal_.take(Event::make(EventKind::pulse, 0, order.sample, detail));
}

void LiveLoop::mark(const Event& trigger) noexcept {
    if (stop_.stopped()) {
        return;
    }
    if (!lines_.rise(Follows::trigger, trigger.sample)) {
        output_failed_ = true;
    }
}

void LiveLoop::take_commands() noexcept {
    for (Command command; commands_.pop(command);) {
        obey(command);
    }
}

void LiveLoop::obey(const Command& command) noexcept {
    switch (command.kind) {
    case CommandKind::arm:
        if (!stop_.stopped()) {
            lines_.mended();
            engine_.set_state(ArmState::armed, StateCause::command, command.by);
        }
        break;
    case CommandKind::disarm:
        // A fault stays one: it is cleared, or armed away, and not by somebody who switches pulses off.
        if (engine_.arbiter().state() != ArmState::faulted) {
            engine_.set_state(ArmState::not_armed, StateCause::command, command.by);
        }
        lines_.fall_now();
        break;
    case CommandKind::clear:
        if (engine_.arbiter().state() == ArmState::faulted && !stop_.stopped()) {
            lines_.mended();
            engine_.set_state(ArmState::not_armed, StateCause::command, command.by);
        }
        break;
    case CommandKind::next_epoch:
        engine_.next_epoch(command.by);
        break;
    case CommandKind::speed:
        ++speeds_;
        speed_.take(command.number, command.came);
        break;
    case CommandKind::stop:
        break; // never comes this way
    case CommandKind::mark:
        engine_.note(command.words());
        break;
    case CommandKind::trial:
        engine_.next_trial();
        break;
    case CommandKind::open_gate:
    case CommandKind::close_gate:
        engine_.set_gate(command.words(), command.kind == CommandKind::open_gate, command.by);
        break;
    }
}

void LiveLoop::take_stop() noexcept {
    if (const auto by = stop_.take()) {
        engine_.set_state(ArmState::faulted, StateCause::emergency_stop, *by);
        lines_.fall_now();
    }
}

void LiveLoop::follow_speed(Nanos now) noexcept {
    if (!settings_.speed_gate.on) {
        return;
    }
    if (const bool open = speed_.open_at(now); open != speed_open_) {
        speed_open_ = open;
        engine_.set_gate(speed_gate_name, open, {ChangeSource::speed});
        journal_speed(now);
    } else if (speeds_ > 0 && engine_.next_sample() >= next_speed_) {
        journal_speed(now);
    }
}

// With every move of the gate, and once a second of the stream while speeds come.
void LiveLoop::journal_speed(Nanos now) noexcept {
    const SampleIndex at = engine_.next_sample();
    next_speed_ = at + static_cast<std::uint64_t>(source_.rate().value);
    journal_.take(
        Event::make(EventKind::speed, 0, at, SpeedDetail{speed_.newest(), (now - speed_.came()).count(), speeds_}));
    speeds_ = 0;
}

void LiveLoop::look_for_trouble() noexcept {
    if (engine_.arbiter().state() == ArmState::faulted) {
        return;
    }
    if (journal_.failed()) {
        engine_.set_state(ArmState::faulted, StateCause::journal_failed);
        lines_.fall_now();
    } else if (const auto trouble = lines_.trouble()) {
        engine_.set_state(ArmState::faulted, *trouble);
        lines_.fall_now();
    }
}

void LiveLoop::on_silence() noexcept {
    // A stream that has not begun is not stale: nothing is settled yet, and nothing can be let through.
    if (last_frames_ == Nanos{0} || monotonic_now() - last_frames_ < settings_.stale_after) {
        return;
    }
    // Also where somebody arms while nothing comes in.
    if (engine_.arbiter().state() == ArmState::armed) {
        engine_.set_state(ArmState::not_armed, StateCause::stale_stream);
        lines_.fall_now();
    }
    if (!stale_) {
        stale_ = true;
        journal_counts();
    }
}

void LiveLoop::journal_counts() noexcept {
    const auto& counts = source_.counts();
    for (std::size_t cause = 0; cause < counts.size(); ++cause) {
        if (counts[cause] != counted_[cause]) {
            journal_.take(Event::make(EventKind::packet_count, static_cast<std::uint8_t>(cause), engine_.next_sample(),
                                      CountDetail{counts[cause] - counted_[cause]}));
        }
    }
    counted_ = counts;
}

} // namespace millpond
