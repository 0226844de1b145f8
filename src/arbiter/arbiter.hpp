// The arbiter: decides which detection becomes a trigger and which moment may have a pulse, and names the one rule that
// refused each of the others. Works in sample time alone, so that a session can be run again from its samples and its
// journal. The same in every condition: what becomes of a trigger is the business of pulse_plan.hpp.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "arbiter/fault_watch.hpp"
#include "arbiter/pulse_limits.hpp"
#include "arbiter/session_plan.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <array>
#include <string>
#include <vector>

namespace millpond {

/// What the detector knew about one crossing, or about the moment of a slot.
struct Candidate {
    SampleIndex at;
    bool settling = false;
    bool unsettled = false;
    bool vetoed = false;
};

/// Thread: loop for everything but make and add_gate. Allocates after make: never.
class Arbiter {
  public:
    static Arbiter make(const ArbiterSettings& settings, Hertz rate);

    /// One more gate, beside those of the settings. Thread: control.
    void add_gate(std::string name, bool open) { gates_.push_back({std::move(name), open}); }

    /// Rule::none where the detection is a trigger, which then counts for lock-out and limits.
    [[nodiscard]] Rule judge(const Candidate& detection) noexcept;

    /// Rule::none where a pulse may be given at this moment for a delayed or scheduled slot, which then counts for the
    /// limits of slots of its origin. Detections play no part in it, nor does it in judging them.
    [[nodiscard]] Rule judge_slot(const Candidate& moment, PulseOrigin origin) noexcept;

    [[nodiscard]] ArmState state() const noexcept { return state_; }
    /// Arming while faulted is allowed: whoever arms says that the fault is mended.
    void set_state(ArmState state) noexcept {
        state_ = state;
        if (state == ArmState::armed) {
            watch_.armed();
        }
    }

    /// Told of gaps and floors; with what `judge` saw it knows when the session must be faulted.
    [[nodiscard]] FaultWatch& watch() noexcept { return watch_; }

    [[nodiscard]] const SessionPlan& plan() const noexcept { return plan_; }
    /// The session's first sample.
    void start_plan(SampleIndex at) noexcept { plan_.start(at); }
    void next_epoch(SampleIndex at) noexcept {
        plan_.next(at);
        for (auto& limits : limits_) {
            limits.begin_epoch();
        }
    }

    /// False where no gate has that name.
    bool set_gate(std::string_view name, bool open) noexcept;
    [[nodiscard]] bool has_gate(std::string_view name) const noexcept;
    [[nodiscard]] bool gates_open() const noexcept;

    [[nodiscard]] std::uint32_t triggers() const noexcept { return of(PulseOrigin::trigger).triggers(); }

    [[nodiscard]] std::size_t gate_count() const noexcept { return gates_.size(); }
    [[nodiscard]] std::string_view gate_name(std::size_t i) const noexcept { return gates_[i].name; }
    [[nodiscard]] bool gate_open(std::size_t i) const noexcept { return gates_[i].open; }

  private:
    [[nodiscard]] PulseLimits& of(PulseOrigin origin) noexcept { return limits_[static_cast<std::size_t>(origin)]; }
    [[nodiscard]] const PulseLimits& of(PulseOrigin origin) const noexcept {
        return limits_[static_cast<std::size_t>(origin)];
    }
    [[nodiscard]] Rule judge(const Candidate& candidate, PulseLimits& limits) noexcept;
    [[nodiscard]] Rule refusal(const Candidate& candidate, const PulseLimits& limits) const noexcept;

    struct Gate {
        std::string name;
        bool open;
    };

    ArmState state_ = ArmState::not_armed;
    std::vector<Gate> gates_;
    std::array<PulseLimits, 3> limits_; // by origin
    FaultWatch watch_;
    SessionPlan plan_;
};

} // namespace millpond
