// A sweep: many detector settings over recordings, each scored on training and held-out parts.
//
// Two stages, because a pulse changes what the detector sees next (statistic_pass.hpp):
//   sweep      scores every setting as a detector to which no pulses are given: condition none, nothing blanked. Band
//              and envelope are computed once for all settings that share them; detections are the engine's own, one
//              by one. Recordings of rest hold no pulses either, so nothing is hidden from a setting by its own.
//   confirm    runs the whole engine, armed, in the condition of the plan, with blanking and lock-out: what `dryrun`
//              runs. For the few that are worth it; the pick is made of these figures.
//
// Parts: every recording is cut into blocks of equal length from its first sample; blocks 1, 3, 5, ... are for
// training, blocks 2, 4, 6, ... are held out. Detectors run over the whole recording, as in a session, so a floor
// remembers across the cuts: held-out parts are apart in their ripples and false detections, not in their floor. A
// ripple belongs to the part that holds its onset, a false detection to the part that holds it.
//
// Thread: cold; the calls use several. Memory: that of the recordings, about 1 MB a thread, and the detections of 64
// settings a thread.
#pragma once

#include "engine/engine.hpp"
#include "tuning/joined_score.hpp"

#include <cstddef>
#include <functional>
#include <optional>
#include <span>
#include <vector>

namespace millpond {

struct SweepPlan {
    Hertz rate;              ///< of all recordings
    ArbiterSettings arbiter; ///< of `confirm`: triggers blank the detector, as in a session
    bool armed = true;       ///< `confirm` runs armed; not armed there are no triggers, and nothing is blanked
    double block_s = 30.0;
    double early_ms = 0.0;
    unsigned threads = 2;
};

/// All called from the calling thread.
struct SweepWatch {
    std::function<void(double)> progress = [](double) {}; ///< share done, 0 to 1
    /// A setting's place in `candidates`, the moment it is known.
    std::function<void(std::size_t, const SweepResult&)> finished = [](std::size_t, const SweepResult&) {};
    std::function<bool()> stop = [] { return false; }; ///< true: end soon; what is unfinished stays empty
};

/// One result for each of `candidates`, in their order; those that have one in `known` (same length, or empty) are not
/// run again. The same at any number of threads. Refuses candidates that the rate or the channels cannot carry.
using SweepResults = std::vector<std::optional<SweepResult>>;
[[nodiscard]] SweepResults sweep(std::span<const TuningRecording> recordings,
                                 std::span<const DetectorSettings> candidates, const SweepPlan& plan,
                                 const SweepWatch& watch = {}, SweepResults known = {});

/// The whole engine over those of `candidates` that `which` names and `known` lacks; others keep what they have.
[[nodiscard]] SweepResults confirm(std::span<const TuningRecording> recordings,
                                   std::span<const DetectorSettings> candidates, std::span<const std::size_t> which,
                                   const SweepPlan& plan, const SweepWatch& watch = {}, SweepResults known = {});

} // namespace millpond
