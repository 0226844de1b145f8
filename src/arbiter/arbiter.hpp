// The arbiter: decides which detection becomes a trigger, and names the one rule that refused each of the others.
// Works in sample time alone, so that a session can be run again from its samples and its journal.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "arbiter/fault_watch.hpp"
#include "arbiter/pulse_limits.hpp"
#include "arbiter/session_plan.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <vector>

namespace millpond {

/// What the detector knew about one crossing.
struct Candidate {
    SampleIndex at;
    bool settling = false;
    bool unsettled = false;
    bool vetoed = false;
    bool scheduled = false; ///< asked for by the control schedule, not by the detector
};

/// Thread: loop for everything but make. Allocates after make: never.
class Arbiter {
  public:
    /// `schedule`: places of a control schedule in ascending order, empty without one.
    static Arbiter make(const ArbiterSettings& settings, Hertz rate, std::vector<SampleIndex> schedule = {});

    /// One more gate, beside those of the settings. Thread: control.
    void add_gate(std::string name, bool open) { gates_.push_back({std::move(name), open}); }

    /// Rule::none where the candidate is a trigger, which then counts for lock-out and limits.
    [[nodiscard]] Rule judge(const Candidate& candidate) noexcept;

    /// Next place of the schedule at or after what was already played; UINT64_MAX where there is none.
    [[nodiscard]] SampleIndex next_scheduled() const noexcept;
    void schedule_played() noexcept;

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
        limits_.begin_epoch();
    }

    /// False where no gate has that name.
    bool set_gate(std::string_view name, bool open) noexcept;
    [[nodiscard]] bool has_gate(std::string_view name) const noexcept;
    [[nodiscard]] bool gates_open() const noexcept;

    [[nodiscard]] std::uint32_t triggers() const noexcept { return limits_.triggers(); }
    [[nodiscard]] Condition condition() const noexcept { return condition_; }

    [[nodiscard]] std::size_t gate_count() const noexcept { return gates_.size(); }
    [[nodiscard]] std::string_view gate_name(std::size_t i) const noexcept { return gates_[i].name; }
    [[nodiscard]] bool gate_open(std::size_t i) const noexcept { return gates_[i].open; }

  private:
    [[nodiscard]] Rule refusal(const Candidate& candidate) const noexcept;

    struct Gate {
        std::string name;
        bool open;
    };

    Condition condition_ = Condition::disrupt;
    ArmState state_ = ArmState::not_armed;
    std::vector<Gate> gates_;
    std::vector<SampleIndex> schedule_;
    std::size_t next_in_schedule_ = 0;
    PulseLimits limits_;
    FaultWatch watch_;
    SessionPlan plan_;
};

} // namespace millpond
