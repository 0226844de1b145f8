// The detector's inner loop: all lanes of a frame in one pass, frame after frame, until something must be decided.
// A lane is one looked-at channel, or one feature of the evidence; the last one used may be the sum over others.
// Thread: loop. Plain data and arithmetic only, so that the same text compiled for three vector widths gives the same
// bits: every lane's operations are the same IEEE ones.
#pragma once

#include <cstddef>
#include <cstdint>

namespace millpond {

/// Lanes come in groups of eight, the widest vector; what is left over is silent.
inline constexpr std::size_t lane_group = 8;

/// Mains hum: what every lane has learned of each multiple of the mains frequency, and the oscillators it is held
/// against.
struct KernelHum {
    std::size_t harmonics = 0;    // 0: nothing is taken out
    std::size_t oscillators = 0;  // the same, up to a multiple of lane_group
    double* in_phase = nullptr;   // [harmonics][lanes]
    double* quadrature = nullptr; // [harmonics][lanes]
    double* cosine = nullptr;     // [oscillators], of the next frame
    double* sine = nullptr;
    const double* turn_cosine = nullptr; // [oscillators], of one frame's turn
    const double* turn_sine = nullptr;
    double* calm = nullptr; // [lanes]: the usual envelope; far above it nothing is learned
    double gain = 0.0;      // what a frame adds to what is learned
    double calm_weight = 0.0;
    double level_follow = 0.0;                      // share of a frame's distance that the level goes after the signal
    std::uint64_t calm_frames = 0, calm_needed = 0; // seen; before so many, all is taken for usual
};

/// Sudden steps: how far the signal stands from where it was 0.4 ms ago, the largest of late, and what is usual.
/// With a mix only.
struct KernelJump {
    double follow = 1.0;  // 1 / (1 + 0.4 ms in frames)
    double fade = 0.0;    // of the largest, a frame
    double weight = 0.0;  // of a frame in the usual
    std::size_t lane = 0; // the one that is asked
    double times = 0.0;   // the usual: beyond it is a jump
    double* followed = nullptr;
    double* largest = nullptr;
    double* usual = nullptr;
    std::uint64_t frames = 0, full_frames = 0; // taken into the usual; until then all weigh the same
};

/// Everything the loop reads and writes. Arrays are 64-byte aligned; `[lanes]` unless said otherwise.
struct KernelState {
    std::size_t lanes = 0;                     // a multiple of lane_group
    std::size_t signal_lanes = 0;              // lanes that carry a signal; the sum's lane, if any, is the next one
    std::size_t channels = 0;                  // values a frame in the stream
    std::size_t inputs = 0;                    // channels looked at
    const std::uint32_t* channel_of = nullptr; // [inputs], and 0 up to [lanes]
    const std::uint64_t* lane_used = nullptr;  // all ones for lanes with a channel, else 0
    const double* mix = nullptr;  // [inputs][lanes]: what a lane takes of each channel; null: lane i is input i
    bool in_stream_order = false; // channel_of[i] == i for all that are used

    std::size_t sections = 0;
    const double* coefficients = nullptr; // [sections][5]: b0 b1 b2 a1 a2; with a mix [sections][5][lanes]
    double* section_states = nullptr;     // [lanes / lane_group][sections][2][lane_group]
    std::size_t taps = 0;
    const double* tap_values = nullptr; // [taps]
    double* history = nullptr;          // [2 * taps][lanes]: written twice, so that the last `taps` are one run
    std::size_t history_at = 0;

    double* level = nullptr;             // taken off every sample: the band-pass ignores it, and a splice makes no step
    double* last = nullptr;              // the last sample, less its level
    double quadrature = 0.0;             // all-pass coefficient: 90 degrees at the centre of the band
    const double* quadratures = nullptr; // [lanes], with a mix
    double* in_phase = nullptr;          // the all-pass filter's last input
    double* turned = nullptr;            // and its last output
    double smoothing = 1.0;              // 1 / (1 + delay of one section in frames)
    const double* smoothings = nullptr;  // [lanes], with a mix
    double* smooth1 = nullptr;
    double* smooth2 = nullptr;
    double* envelope = nullptr;
    const double* sum_weight = nullptr; // [lanes]: mean over sites, or weights of the evidence; null: no sum

    KernelHum hum;
    KernelJump jump;

    double* mean = nullptr;        // the floor
    double* spread = nullptr;      // running mean of |envelope - mean|
    double clip = 0.0;             // in spreads
    const double* above = nullptr; // threshold, in spreads above the mean
    const double* rearm = nullptr;
    const std::uint64_t* above_adds = nullptr; // what an envelope above its threshold adds to the frame's tally
    const std::uint64_t* rearm_adds = nullptr;
};

/// Always inlined: a copy compiled for wide vectors must not serve all.
[[nodiscard, gnu::always_inline]] inline bool jumped(const KernelJump& jump) noexcept {
    return jump.largest[jump.lane] > jump.times * jump.usual[jump.lane];
}

/// A frame's tally: three counts in one word. Always inlined: a copy compiled for wide vectors must not serve all.
struct Tally {
    static constexpr std::uint64_t vote = 1;                // voting lanes above the threshold
    static constexpr std::uint64_t vote_rearm = 1ULL << 16; // voting lanes above the re-arm level
    static constexpr std::uint64_t reference = 1ULL << 32;  // reference lanes above their threshold
    std::uint64_t word = 0;
    [[nodiscard, gnu::always_inline]] std::uint32_t votes() const noexcept { return word & 0xFFFF; }
    [[nodiscard, gnu::always_inline]] std::uint32_t rearm_votes() const noexcept { return (word >> 16) & 0xFFFF; }
    [[nodiscard, gnu::always_inline]] std::uint32_t references() const noexcept { return (word >> 32) & 0xFFFF; }
};

enum class KernelEnvelope : std::uint8_t {
    rectify,
    energy,
    analytic
};

/// What one call shall do.
struct KernelOrder {
    const float* frames = nullptr;
    std::size_t count = 0;
    KernelEnvelope method = KernelEnvelope::rectify;
    bool resume = false;       // first frame after a splice: the level jumps so that the signal does not
    double weight = 0.0;       // of one frame in the floor; 0 leaves the floor alone
    std::uint64_t warming = 0; // frames in the floor so far, while each weighs as much as those before it; 0: `weight`
    std::uint32_t stop_at_votes = 0;    // stop after a frame with this many votes (waiting for a crossing) ...
    std::uint32_t stop_below_rearm = 0; // ... or after one with fewer re-arm votes than this; 0: never
    double* envelopes = nullptr;        // [count][lanes]: where envelopes go; then nothing is compared
    unsigned char* jumped = nullptr;    // [count]: and where 1 goes for a frame soon after a jump
};

struct KernelResult {
    std::size_t frames = 0; // worked through; the tally is that of the last
    Tally tally;
    std::size_t last_reference = SIZE_MAX; // newest of these frames with a reference above, if any
};

using Kernel = KernelResult (*)(KernelState&, const KernelOrder&) noexcept;

KernelResult run_kernel_sse2(KernelState&, const KernelOrder&) noexcept;
KernelResult run_kernel_avx2(KernelState&, const KernelOrder&) noexcept;
KernelResult run_kernel_avx512(KernelState&, const KernelOrder&) noexcept;

/// Frames from the start of `frames` without a non-finite value on a looked-at channel.
std::size_t finite_frames(const float* frames, std::size_t count, const KernelState& state) noexcept;

} // namespace millpond
