// When pulses may be due, and whether they are: what becomes of a trigger in each condition.
// The moments, called slots, are the same in every condition, and so is all that acts on the detector there (blanking
// above all): a condition only says at which of them a pulse is given. So two conditions have the same chance to
// detect, and what tells them apart is the pulse alone.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "base/event.hpp"
#include "base/random.hpp"
#include "base/units.hpp"

#include <utility>
#include <vector>

namespace millpond {

/// A moment at which a pulse may be due, after or without a trigger.
struct PulseSlot {
    SampleIndex due;
    SampleIndex planned;      ///< where it would be if nothing held it
    SampleIndex from;         ///< decision sample of its trigger; the planned place of a schedule
    std::uint32_t number = 0; ///< of its trigger, or its place in the schedule, from 1
    PulseOrigin origin{};
    bool caught = false;    ///< its trigger is a catch trial
    std::uint32_t unit = 0; ///< of the assignment, in which its trigger fell
};

/// Thread: loop for everything but make. Allocates after make: never.
class PulsePlan {
  public:
    /// `schedule`: places of a control schedule in ascending order, empty without one.
    static PulsePlan make(const ArbiterSettings& settings, Hertz rate, std::vector<SampleIndex> schedule = {});

    /// A trigger: draws whether it is a catch trial and, where there are delayed slots, its delay; in every condition.
    /// True: a catch trial.
    bool take_trigger(SampleIndex at, std::uint32_t number) noexcept;

    /// Where the next slot is due; UINT64_MAX where there is none.
    [[nodiscard]] SampleIndex next_due() const noexcept;
    /// The slot that is due next.
    [[nodiscard]] PulseSlot next() const noexcept;
    /// It can't be now: it is due again a little later. False where it has been held for too long already, or where it
    /// may not be held.
    bool hold(SampleIndex now) noexcept;
    void done() noexcept;

    /// Whether a slot of that origin waits until no ripple is going on; the same in every condition.
    [[nodiscard]] bool waits_for_quiet(PulseOrigin origin) const noexcept {
        return origin == PulseOrigin::delay || schedule_waits_;
    }
    /// Frames without a ripple before one counts as over.
    [[nodiscard]] std::uint64_t quiet_frames() const noexcept { return quiet_frames_; }

    /// Whether this condition gives pulses at moments of that origin. Never within a lock-out after a unit of an
    /// assignment began, so that pulses of two conditions cannot meet.
    [[nodiscard]] bool gives(PulseOrigin origin, SampleIndex now) const noexcept;
    /// The same of a slot, and only where its trigger fell into the unit that is on.
    [[nodiscard]] bool gives(const PulseSlot& slot, SampleIndex now) const noexcept;

    [[nodiscard]] Condition condition() const noexcept { return condition_; }

    /// Conditions by an assignment, one for each session, block or trial in order; the first begins with
    /// `begin_unit`. After the last there are no pulses. Thread: control, before the session.
    void assign(std::vector<Condition> list) { assigned_ = std::move(list); }
    [[nodiscard]] bool is_assigned() const noexcept { return !assigned_.empty(); }
    /// The next one begins. Its number, from 1; false where the list was at its end.
    std::pair<std::uint32_t, bool> begin_unit(SampleIndex at) noexcept;

  private:
    [[nodiscard]] PulseSlot next_of_schedule() const noexcept;
    [[nodiscard]] bool schedule_first() const noexcept;

    Condition condition_ = Condition::disrupt;
    std::vector<Condition> assigned_;
    std::uint32_t units_begun_ = 0;
    SampleIndex pause_until_{};
    std::uint64_t lockout_frames_ = 0;
    Random draws_{0, 0};
    double catch_share_ = 0.0;
    bool has_delays_ = false, schedule_waits_ = true;
    std::uint64_t least_delay_ = 0, delay_span_ = 0; // frames
    std::uint64_t quiet_frames_ = 0, hold_step_ = 1, longest_hold_ = 0;
    std::vector<PulseSlot> pending_; // delayed slots by due place; room for as many as can wait at once
    std::vector<SampleIndex> schedule_;
    std::size_t next_place_ = 0;
    SampleIndex place_due_{UINT64_MAX}; // of the schedule's next place, once it was held
};

} // namespace millpond
