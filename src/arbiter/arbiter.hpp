// The arbiter: decides which detection becomes a trigger and which moment may have a pulse, and names the one rule that
// refused each of the others. Works in sample time alone, so that a session can be run again from its samples and its
// journal. The same in every condition: what becomes of a trigger is the business of pulse_plan.hpp.
#pragma once

#include "arbiter/arbiter_settings.hpp"
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
    void set_state(ArmState state) noexcept { state_ = state; }

    /// False where no gate has that name.
    bool set_gate(std::string_view name, bool open) noexcept;
    [[nodiscard]] bool has_gate(std::string_view name) const noexcept;
    [[nodiscard]] bool gates_open() const noexcept;

    [[nodiscard]] std::uint32_t triggers() const noexcept { return of(PulseOrigin::trigger).count; }

    [[nodiscard]] std::size_t gate_count() const noexcept { return gates_.size(); }
    [[nodiscard]] std::string_view gate_name(std::size_t i) const noexcept { return gates_[i].name; }
    [[nodiscard]] bool gate_open(std::size_t i) const noexcept { return gates_[i].open; }

  private:
    /// Moments that were let through, of one origin.
    struct Counted {
        std::uint32_t count = 0;
        std::vector<SampleIndex> recent; // ring of the last max_pulses_per_second ones
    };
    [[nodiscard]] Counted& of(PulseOrigin origin) noexcept { return counted_[static_cast<std::size_t>(origin)]; }
    [[nodiscard]] const Counted& of(PulseOrigin origin) const noexcept {
        return counted_[static_cast<std::size_t>(origin)];
    }
    [[nodiscard]] Rule judge(const Candidate& candidate, Counted& counted) noexcept;
    [[nodiscard]] Rule refusal(const Candidate& candidate, const Counted& counted) const noexcept;
    [[nodiscard]] Rule limit(SampleIndex at, const Counted& counted) const noexcept;

    struct Gate {
        std::string name;
        bool open;
    };

    ArmState state_ = ArmState::not_armed;
    std::vector<Gate> gates_;
    std::uint64_t lockout_frames_ = 0;
    std::uint64_t second_frames_ = 0;
    std::uint32_t session_limit_ = 0;
    std::array<Counted, 3> counted_; // by origin
};

} // namespace millpond
