// What is no signal, or signal on all channels alike. Thread: cold.
//
// Four causes, each with `pad_ms` before and after:
//   missing  a value that is not finite on a ripple or reference channel, or frames left out between blocks;
//   railed   a value as far from 0 as `rail_uv`;
//   flat     one value kept for `flat_ms`, which is also what most railed amplifiers show;
//   common   the band's envelope above its mean + `common_deviations` SD on every ripple and reference channel in the
//            same 10 ms ('rise on all sites at once', Liu et al. 2022, Nat Commun 13:6000 [seen]; the figures are
//            chosen here). Without a reference it is not looked for: ripples rise on all ripple sites at once.
// A channel that is flat or railed for half of the recording or more is dead: it excludes nothing and need not rise. It
// is named, so that its role can be set to unused.
#pragma once

#include "base/units.hpp"
#include "referee/eligible_time.hpp"
#include "referee/referee_settings.hpp"

#include <cstdint>
#include <span>
#include <vector>

namespace millpond {

struct ArtefactFindings {
    Intervals excluded;                                          ///< of all causes, with their pads
    std::uint64_t missing = 0, railed = 0, flat = 0, common = 0; ///< stretches by cause, before pads join them
    std::vector<std::size_t> dead_channels;                      ///< places in the frame
};

/// Takes raw frames and, behind them, the band signal of the same channels. Memory: one value a channel each 10 ms
/// where common rises are looked for, else next to none.
class ArtefactWatch {
  public:
    /// `channels`: ripple and reference channels by their places in the frame; `with_reference`: one of them is one.
    ArtefactWatch(const RefereeArtefactSettings& settings, std::vector<std::size_t> channels, bool with_reference,
                  Hertz rate);

    /// A frame of all channels of the recording, at `at`.
    void look(std::span<const float> frame, SampleIndex at);
    void look_at_missing(SampleIndex from, SampleIndex to);

    /// The band signal of the watched channels, frame after frame from the first one looked at; missing frames too.
    void add_band(std::span<const double> frame);
    void skip_band(std::uint64_t frames);

    /// Once, at the end. `first` and `end` of the recording.
    [[nodiscard]] ArtefactFindings finish(SampleIndex first, SampleIndex end);

  private:
    struct Watched {
        std::size_t place;
        float value; // held since `since`
        SampleIndex since, rail_since;
        bool holding, at_rail;
        Intervals flat, railed;
        std::vector<float> rises; // envelope of each 10 ms, NaN where missing
        double energy;
    };
    void let_go(Watched& channel, SampleIndex at) const;
    void leave_rail(Watched& channel, SampleIndex at) const;
    void close_bin();
    [[nodiscard]] Intervals common_rises(const std::vector<bool>& dead, SampleIndex first) const;

    RefereeArtefactSettings settings_;
    Hertz rate_;
    bool common_;
    std::uint64_t flat_frames_, bin_frames_;
    std::vector<Watched> channels_;
    Intervals missing_;
    std::uint64_t in_bin_ = 0, present_ = 0; // frames of the bin so far, and those of them that are there
};

} // namespace millpond
