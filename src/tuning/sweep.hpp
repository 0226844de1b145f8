// A sweep: the engine over recordings with many detector settings, each scored on training and held-out parts.
//
// Parts: every recording is cut into blocks of equal length from its first sample; blocks 1, 3, 5, ... are for
// training, blocks 2, 4, 6, ... are held out. The engine runs over the whole recording, as in a session, so its floor
// remembers across the cuts: held-out parts are apart in their ripples and false detections, not in their floor. A
// ripple belongs to the part that holds its onset, a false detection to the part that holds it.
//
// The pick: settings whose false per minute on the training parts is at most the limit are ranked by their hit rate
// there (equal ones by the shorter median latency, then fewer false per minute, then their place in the grid). The
// first of them whose false per minute on the held-out parts is at most the limit too is picked. Held-out figures of
// the pick are untouched by tuning where it is the first of the ranking; each one passed over has used them once.
#pragma once

#include "base/channels.hpp"
#include "engine/engine.hpp"
#include "referee/scoring.hpp"

#include <cstddef>
#include <functional>
#include <optional>
#include <span>
#include <vector>

namespace millpond {

struct TuningRecording {
    Channels channels;
    std::span<const float> data; ///< shape as in base/frames.hpp; must outlive the sweep
    Ripples truth;
    Intervals excluded{}; ///< time that the truth does not speak of: never eligible

    [[nodiscard]] std::uint64_t frames() const noexcept { return data.size() / channels.size(); }
};

struct SweepPlan {
    Hertz rate;              ///< of all recordings
    ArbiterSettings arbiter; ///< triggers blank the detector, as in a session; runs armed
    double block_s = 30.0;
    double early_ms = 0.0;
    unsigned threads = 2;
};

struct SweepResult {
    Score training, held_out;
    double delay_ms = 0.0; ///< of filter and smoother
};

/// One result for each of `candidates`, in their order, the same at any number of threads. `done` hears of each one
/// that is finished (from the calling thread). Refuses candidates that the rate cannot carry.
[[nodiscard]] std::vector<SweepResult> sweep(std::span<const TuningRecording> recordings,
                                             std::span<const DetectorSettings> candidates, const SweepPlan& plan,
                                             const std::function<void(std::size_t)>& done);

/// Training and held-out parts of a recording.
struct Parts {
    Intervals training, held_out;
};
[[nodiscard]] Parts parts_of(std::uint64_t frames, std::uint64_t block_frames);

struct Pick {
    std::size_t index = 0;
    std::size_t passed_over = 0; ///< ranked before it, but above the limit on the held-out parts
};

/// Places in `results` of those at most at the limit on the training parts, best first.
[[nodiscard]] std::vector<std::size_t> ranking(std::span<const SweepResult> results, double max_false_per_minute);

/// Empty where nothing is at most at the limit on both parts.
[[nodiscard]] std::optional<Pick> pick(std::span<const SweepResult> results, double max_false_per_minute);

} // namespace millpond
