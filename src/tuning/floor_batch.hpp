// Floors, thresholds and re-arming of sixteen settings side by side over the same envelopes. Private to this room.
// Thread: one. Every setting's operations are those of detector/detector.cpp and detector/kernel_body.inl in their
// order, so that crossings are the detector's own to the bit; tests/tuning/shared_pass_test.cpp holds it to that.
#pragma once

#include "detector/floor_start.hpp"
#include "tuning/statistic_pass.hpp"

#include <array>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace millpond {

inline constexpr std::size_t batch_width = 16;
template <class Value> struct alignas(64) BatchOf {
    std::array<Value, batch_width> values{};
    Value& operator[](std::size_t i) noexcept { return values[i]; }
    const Value& operator[](std::size_t i) const noexcept { return values[i]; }
};

/// The floor of one column of envelopes, for each of the settings.
struct ColumnFloor {
    std::size_t column = 0;
    BatchOf<double> mean, spread;
    BatchOf<double> above, rearm; ///< in spreads above the mean
    BatchOf<double> waited_for;   ///< the one of the two that says when there is something to decide
    BatchOf<double> quiet;        ///< the lower of that one and the clip: below it nothing happens but averaging
    BatchOf<double> next_mean, next_spread;
};

/// What the inner loop reads and writes. Masks are all ones or zero.
struct BatchState {
    std::vector<ColumnFloor> voting, references;
    BatchOf<double> clip;           ///< in spreads
    BatchOf<double> weight;         ///< of the next frame in the floor, 0 while it stands still
    BatchOf<double> frames;         ///< in the floor's statistics
    BatchOf<double> most_frames;    ///< from which on a frame's weight stays the same
    BatchOf<std::int64_t> active;   ///< mask: the floor takes frames in
    BatchOf<std::int64_t> needed;   ///< votes
    BatchOf<std::int64_t> spent;    ///< mask: crossed, and not below the re-arm level since
    BatchOf<std::int64_t> counting; ///< mask: above, but not for long enough yet
    BatchOf<std::int64_t> newest_reference;
    BatchOf<std::int64_t> votes, rearm_votes; ///< of the last frame worked through
    bool warming = true;                      ///< weights still change from frame to frame
    bool clips_below = false;                 ///< evidence can fall as far as it can rise
    bool any_counting = false, any_spent = false;
};

/// Frames that are tried at once; `EnvelopeBlock::highest` has one row for each.
inline constexpr std::size_t stride_frames = 8;

/// A block of envelopes, `values` numbers a frame, and the highest and lowest of each number over every stride.
struct EnvelopeBlock {
    const double* envelopes = nullptr;
    const double* highest = nullptr;
    const double* lowest = nullptr;
    std::size_t values = 0, frames = 0;
};

/// Works through the block's frames from `from` up to `to`; stops after the first at which a setting has something to
/// decide. `place`: that of the block's first frame. Returns the frames worked through; `due` is false where all went
/// by without.
std::size_t walk_batch(BatchState& state, const EnvelopeBlock& block, std::size_t from, std::size_t to,
                       std::uint64_t place, bool& due) noexcept;

/// Numbers in a frame of envelopes: first those that vote, then those of references.
struct EnvelopeColumns {
    std::size_t voting = 0, references = 0;
};

class FloorBatch {
  public:
    /// At most batch_width settings, all with the same length of the floor's start.
    FloorBatch(std::span<const DetectorSettings> settings, const EnvelopeColumns& columns, Hertz rate,
               std::uint64_t filter_settle_frames);

    void gap(std::uint64_t resumes_at) noexcept;
    void take(std::uint64_t first, const EnvelopeBlock& block);
    [[nodiscard]] std::vector<Detections>& detections() noexcept { return found_; }

    /// Frames of the floor's start: settings of one batch share them.
    [[nodiscard]] static std::uint64_t start_frames(const DetectorSettings& settings, Hertz rate) noexcept;

  private:
    struct Setting {
        std::uint64_t freeze = 0, min_above = 1, veto_window = 0, settle = 0;
        std::uint64_t frozen_until = 0, above_run = 0;
        double last_weight = 0.0; ///< of a frame, once the floor's first time constant is over
    };

    void fill(std::size_t lane, const DetectorSettings& settings, Hertz rate);
    [[nodiscard]] std::size_t stretch(std::uint64_t position, std::size_t count) const noexcept;
    std::size_t begin(std::uint64_t first, const EnvelopeBlock& block);
    void set_active(std::uint64_t position) noexcept;
    void decide(std::uint64_t position);
    bool count_above(std::size_t lane, std::uint64_t position);
    void set_spent(std::size_t lane, std::int64_t spent) noexcept;
    void look_at_clock(std::uint64_t position) noexcept;

    BatchState state_;
    FloorStart start_;
    std::vector<Setting> settings_;
    std::vector<Detections> found_;
    std::uint64_t filter_settle_ = 0, settling_until_ = 0, second_ = 1, next_change_ = 0;
};

} // namespace millpond
