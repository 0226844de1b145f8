// Eligible time: time in which a trigger was possible. Built from the events of a session or run. Thread: cold.
//
// Two readings, by who is being scored:
//   detector  statistics settled, no gap and filters settled after it, not blanked after a trigger. What the arbiter
//             allowed does not count: a detector is scored on every crossing that it did not refuse itself.
//   session   the same, and armed, all gates open, pulses allowed by the plan, not in lock-out after a trigger.
// `settled` is known once a second, from the floor events: eligible time begins with the first one in which every site
// had settled, so at most one second of it is given away.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"

#include <cstdint>
#include <span>
#include <vector>

namespace millpond {

/// Frames from `from` up to, not including, `to`.
struct Interval {
    SampleIndex from, to;

    bool operator==(const Interval&) const = default;
};

/// Ascending, not touching each other.
using Intervals = std::vector<Interval>;

struct EligibleRules {
    std::uint64_t settle_frames = 0; ///< filters settle this long after the start and after a gap
    double blanking_ms = 0.0;        ///< the detector holds its state this long after a trigger
    bool session = false;            ///< the session's reading; else the detector's
    double lockout_ms = 0.0;         ///< session only
};

/// Within [from, to). `events` in journal order. Where they hold no floor event nothing is eligible.
/// The frame of a trigger is itself eligible; blanking and lock-out begin with the next one. Blanking at a slot begins
/// with its own frame, whether a pulse was given there or not.
[[nodiscard]] Intervals eligible_time(std::span<const Event> events, const EligibleRules& rules, Hertz rate,
                                      SampleIndex from, SampleIndex to);

[[nodiscard]] bool contains(const Intervals& intervals, SampleIndex at) noexcept;
[[nodiscard]] std::uint64_t frames_in(const Intervals& intervals) noexcept;
[[nodiscard]] Intervals intersection(const Intervals& a, const Intervals& b);
/// What of `intervals` is not in `excluded`.
[[nodiscard]] Intervals without(const Intervals& intervals, const Intervals& excluded);
/// Whether the frames from `first` to `last`, both included, meet one of them.
[[nodiscard]] bool touches(const Intervals& intervals, SampleIndex first, SampleIndex last) noexcept;

/// Decision samples of the detector: its crossings, without those that it refused itself (rules gap, unsettled, veto).
/// Those that the arbiter refused stay: whether the detector was right does not depend on what was allowed.
[[nodiscard]] std::vector<SampleIndex> detections_to_score(std::span<const Event> events);

} // namespace millpond
