// Delayed and scheduled pulses after a session: what was planned and what came of it. Made of the events alone, of the
// slots, the omitted and the orders; the schedule's file and the ripples add to it where they are known. Thread: cold.
//
// A moment for a pulse was given (an order), a phantom (the condition gave none there, all else was the same), a catch
// trial (drawn to get none in any condition), omitted (no condition may have given one; the rule says why), or not
// reached (the session ended before). Only the first three were let through: `kept`.
// held: time from the planned place to where it came; of scheduled moments, since of delayed ones the events do not
// tell the delay that was drawn.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"
#include "referee/eligible_time.hpp"
#include "referee/ripple.hpp"
#include "referee/score_json.hpp"
#include "referee/scoring.hpp"
#include "sham/schedule.hpp"
#include "sham/two_sample_test.hpp"

#include <array>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace millpond {

enum class MomentFate : std::uint8_t {
    given,
    phantom,
    catch_trial,
    omitted,
    not_reached
};
[[nodiscard]] std::string_view name_of(MomentFate fate) noexcept;

struct Moment {
    PulseOrigin origin{};
    std::uint32_t number = 0; ///< of its trigger, or its place in the schedule, from 1
    SampleIndex from;         ///< decision sample of its trigger; the planned place of a schedule
    SampleIndex at;           ///< where it came, or would have
    MomentFate fate{};
    Rule rule = Rule::none;          ///< of an omitted one
    std::optional<bool> in_ripple{}; ///< empty: not known
};

/// Ripples that the session's signal is taken to have had.
struct KnownRipples {
    const Ripples& ripples;
    double early_ms = 0.0; ///< a moment belongs to a ripple from onset - early on, as a detection does
    Intervals unknown{};   ///< time in which nobody can tell, such as artefacts
};

/// Of one origin: delay or schedule.
struct MomentFigures {
    std::uint64_t came = 0; ///< moments that the session came to
    std::uint64_t given = 0, phantoms = 0, catch_trials = 0, omitted = 0;
    std::array<std::uint64_t, rule_count> omitted_by{}; ///< by Rule
    std::optional<std::uint64_t> planned, not_reached;  ///< empty: not known
    std::uint64_t held = 0;                             ///< kept moments that came later than planned
    Distribution held_ms;                               ///< of those held
    Distribution after_trigger_ms;                      ///< of delayed ones: from the trigger to where it came
    Proportion given_in_ripples, phantoms_in_ripples;   ///< of those of which it is known
    Distribution planned_intervals_s, kept_intervals_s; ///< of the moments that the session came to, as planned (delay:
                                                        ///< of their triggers), and of those kept
    TwoSampleTest compared;                             ///< the one against the other
};

struct ControlFigures {
    std::vector<Moment> moments; ///< by place
    MomentFigures scheduled, delayed;
    std::string about_schedule; ///< what is wrong with the schedule's file; empty: nothing, or there is none

    [[nodiscard]] bool none() const noexcept { return moments.empty(); }
};

/// `schedule`: places of the schedule's file; null where it is not known. `ripples`: null where they are not known.
[[nodiscard]] ControlFigures control_figures(std::span<const Event> events, const Schedule* schedule,
                                             const KnownRipples* ripples, Hertz rate);

/// A section of the audit's text; empty where there were no moments and nothing is wrong.
[[nodiscard]] std::string control_text(const ControlFigures& figures);
[[nodiscard]] Json control_json(const ControlFigures& figures);
/// One row for each moment, as an events table. All of this tells of the condition.
[[nodiscard]] std::string control_table(const ControlFigures& figures, Hertz rate);

} // namespace millpond
