// What the detector remembers: the kernel's arrays, and the few scalars that decide. Private to this room.
#pragma once

#include "detector/detector.hpp"
#include "detector/floor_start.hpp"
#include "detector/kernel.hpp"
#include "detector/lanes.hpp"
#include "detector/mains_removal.hpp"
#include "detector/site_mix.hpp"
#include "detector/site_watch.hpp"
#include "detector/state_gate.hpp"

#include <array>
#include <memory>
#include <vector>

namespace millpond {

struct Detector::State {
    std::size_t advance(const FrameBlock& block, std::optional<Crossing>& crossing) noexcept;
    [[nodiscard]] KernelOrder next_order(const FrameBlock& block) const noexcept;
    std::size_t skip_blanked(std::size_t frames) noexcept;
    void start_floor() noexcept;
    bool decide(Tally tally) noexcept;
    [[nodiscard]] Crossing crossing_here(Tally tally) const noexcept;
    void clear_filters() noexcept;
    [[nodiscard]] std::uint16_t channel_at(std::size_t lane) const noexcept;
    [[nodiscard]] bool evidence() const noexcept { return settings.method == DetectionMethod::evidence; }
    [[nodiscard]] bool watches_sites() const noexcept { return evidence() && settings.evidence.site_watch.on; }
    [[nodiscard]] std::size_t sum_lanes() const noexcept {
        return evidence() || settings.vote.rule == VoteRule::mean ? 1 : 0;
    }
    /// The evidence's features have no floors that anyone looks at.
    [[nodiscard]] std::size_t first_floor() const noexcept { return evidence() ? lanes.signal_lanes : 0; }
    void watch_sites(const FrameBlock& block) noexcept;
    void mix_anew() noexcept;
    [[nodiscard]] bool jumped() const noexcept;
    KernelResult run_kernel(const KernelOrder& order) noexcept;
    void watch(const FrameBlock& block) noexcept;
    [[nodiscard]] std::uint64_t frames_to_verdict() const noexcept;

    void choose_inputs(const Channels& channels);
    void choose_lanes();
    void choose_features(const std::string& where);
    void allocate_filter();
    void allocate_own_filters(const std::string& where);
    void allocate_envelope();
    void allocate_floor();
    void vote_of(std::size_t lane) const;
    void allocate_sites_floor();
    void allocate_jumps();
    void allocate_evidence_floor(const std::string& where);
    void count_frames();

    DetectorSettings settings;
    Hertz rate;
    BandpassDesign design;
    KernelWidth width = KernelWidth::sse2;
    Kernel kernel = nullptr;
    KernelEnvelope method = KernelEnvelope::rectify;
    KernelState lanes;

    std::vector<ChannelRole> inputs; // roles of the looked-at channels
    std::vector<std::uint32_t> channel_of;
    Lanes<double> coefficients, section_states, tap_values, history;
    Lanes<double> level, last, in_phase, turned, smooth1, smooth2, envelope, sum_weight;
    Lanes<double> mix, quadratures, smoothings; // evidence only

    std::vector<FeatureSettings> features; // those that have something to look at
    std::vector<std::size_t> mix_of;       // [features]
    SiteMixes mixes;
    SiteWatch site_watch;
    Lanes<double> followed, largest_jump, usual_jump;
    std::size_t heaviest = 0;         // feature that speaks loudest for a ripple
    std::vector<double> mix_weights;  // room for one mix
    std::vector<SiteState> journaled; // [inputs], as the engine last heard
    bool sites_changed = false;
    MainsRemoval mains;
    StateGate state_gate;
    bool state_changed = false;
    Lanes<double> mean, spread, above, rearm;
    Lanes<std::uint64_t> lane_used, above_adds, rearm_adds;

    FloorStart start;               // the floor's first second
    std::uint64_t floor_frames = 0; // frames in the floor's statistics
    struct Memory {
        Lanes<double> mean, spread;
        std::uint64_t frames = 0;
    };
    std::array<Memory, 2> memories; // of the floor, by gates closed or open; the one in use stands above
    bool gates_open = true;
    std::uint64_t settle_frames = 0, full_frames = 0;
    double least_weight = 0.0;

    double filter_delay = 0.0, delay = 0.0; // samples
    std::uint64_t filter_settle = 0;        // frames the chain needs after a gap
    std::uint64_t freeze = 0, min_above = 0, blanking = 0, veto_window = 0;
    std::uint32_t votes_needed = 1;

    std::uint64_t position = 0; // place of the next frame
    std::uint64_t settling_until = 0;
    std::uint64_t frozen_until = 0;
    std::uint64_t blank_from = UINT64_MAX, blank_until = 0;
    std::uint64_t newest_reference = UINT64_MAX; // place of the last reference crossing; UINT64_MAX: none yet
    std::uint64_t above_run = 0;                 // frames in a row that the vote was above
    bool spent = false;                          // crossed, and not below the re-arm level since
    std::uint64_t quiet_since = UINT64_MAX; // place after the last frame of the last crossing; UINT64_MAX: none yet
    bool resume = false;                    // next frame follows a splice

    Detector::Watcher watcher = nullptr;
    void* watcher_context = nullptr;
};

} // namespace millpond
