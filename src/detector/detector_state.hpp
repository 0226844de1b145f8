// What the detector remembers: the kernel's arrays, and the few scalars that decide. Private to this room.
#pragma once

#include "detector/detector.hpp"
#include "detector/floor_start.hpp"
#include "detector/kernel.hpp"

#include <cstdlib>
#include <memory>
#include <new>
#include <vector>

namespace millpond {

/// Zeroed memory on a cache line's boundary, as the kernel wants it.
template <class Value> class Lanes {
  public:
    Lanes() = default;
    explicit Lanes(std::size_t count)
        : count_(count), values_(static_cast<Value*>(std::aligned_alloc(64, (count * sizeof(Value) + 63) / 64 * 64))) {
        if (!values_) {
            throw std::bad_alloc();
        }
        fill(Value{});
    }
    void fill(Value value) noexcept {
        for (std::size_t i = 0; i < count_; ++i) {
            values_.get()[i] = value;
        }
    }
    [[nodiscard]] Value* data() const noexcept { return values_.get(); }
    Value& operator[](std::size_t i) const noexcept { return values_.get()[i]; }
    [[nodiscard]] std::size_t size() const noexcept { return count_; }

  private:
    struct Free {
        void operator()(Value* values) const noexcept { std::free(values); }
    };
    std::size_t count_ = 0;
    std::unique_ptr<Value, Free> values_;
};

struct Detector::State {
    std::size_t advance(const FrameBlock& block, std::optional<Crossing>& crossing) noexcept;
    [[nodiscard]] KernelOrder next_order(const FrameBlock& block) const noexcept;
    std::size_t skip_blanked(std::size_t frames) noexcept;
    void start_floor() noexcept;
    bool decide(Tally tally) noexcept;
    [[nodiscard]] Crossing crossing_here(Tally tally) const noexcept;
    void clear_filters() noexcept;
    [[nodiscard]] std::uint16_t channel_at(std::size_t lane) const noexcept;
    [[nodiscard]] std::size_t mean_lanes() const noexcept { return settings.vote.rule == VoteRule::mean ? 1 : 0; }

    void choose_lanes(const Channels& channels);
    void allocate_filter();
    void allocate_envelope();
    void allocate_floor(const Channels& channels);
    void count_frames();

    DetectorSettings settings;
    Hertz rate;
    BandpassDesign design;
    KernelWidth width = KernelWidth::sse2;
    Kernel kernel = nullptr;
    KernelEnvelope method = KernelEnvelope::rectify;
    KernelState lanes;

    std::vector<std::uint32_t> channel_of;
    Lanes<double> coefficients, section_states, tap_values, history;
    Lanes<double> level, last, in_phase, turned, smooth1, smooth2, envelope, mean_weight;
    Lanes<double> mean, spread, above, rearm;
    Lanes<std::uint64_t> lane_used, above_adds, rearm_adds;

    FloorStart start;               // the floor's first second
    std::uint64_t floor_frames = 0; // frames in the floor's statistics
    std::uint64_t settle_frames = 0, full_frames = 0;
    double least_weight = 0.0;

    std::uint64_t filter_settle = 0; // frames the chain needs after a gap
    std::uint64_t freeze = 0, min_above = 0, blanking = 0, veto_window = 0;
    std::uint32_t votes_needed = 1;

    std::uint64_t position = 0; // place of the next frame
    std::uint64_t settling_until = 0;
    std::uint64_t frozen_until = 0;
    std::uint64_t blank_from = UINT64_MAX, blank_until = 0;
    std::uint64_t newest_reference = UINT64_MAX; // place of the last reference crossing; UINT64_MAX: none yet
    std::uint64_t above_run = 0;                 // frames in a row that the vote was above
    bool spent = false;                          // crossed, and not below the re-arm level since
    bool resume = false;                         // next frame follows a splice

    Detector::Watcher watcher = nullptr;
    void* watcher_context = nullptr;
};

} // namespace millpond
