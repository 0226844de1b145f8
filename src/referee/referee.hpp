// The referee: non-causal re-detection of ripples, the truth on recordings without labels.
//
// Zero-phase Butterworth band-pass, square, sum over ripple sites, Gaussian smoothing, square root. Smoothing that
// covers half a cycle of the band makes this the smoothed analytic envelope: a sine of A uV on every site comes out as
// A uV. Then: threshold at the peak, lower threshold at the edges, merging, shortest duration (referee_settings.hpp
// says where each comes from). Mean and SD are taken over all frames, with envelopes above mean + clip_deviations SD
// counted as that, repeated until it moves no more.
//
// Frames with a non-finite value on a ripple or reference channel are missing, and so are frames left out between
// blocks: no ripple crosses them and the statistics skip them. Channels of role reference and unused are not looked at
// otherwise.
#pragma once

#include "base/channels.hpp"
#include "base/frames.hpp"
#include "referee/referee_settings.hpp"
#include "referee/ripple.hpp"
#include "referee/zero_phase.hpp"

#include <string>
#include <vector>

namespace millpond {

struct RefereeFindings {
    Ripples ripples;
    double mean = 0.0;      ///< of the envelope, clipped, uV
    double deviation = 0.0; ///< of the envelope, clipped, uV
    std::uint64_t frames_judged = 0;
};

/// Takes a recording block by block, answers at its end. Thread: one, cold. Memory: 8 bytes a frame, whatever the
/// number of channels, and a few seconds of the sites' signal.
class Referee {
  public:
    /// Refuses a band that the rate cannot carry, edges above the peak, smoothing shorter than half a cycle's worth
    /// (240 / low_hz ms), and channels without a ripple site. `where` names the settings for the message.
    static Referee make(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                        const std::string& where = "referee");

    /// Blocks in order; a block may start later than the last one ended, never earlier.
    void add(const FrameBlock& block);

    /// Ends the recording. Call once.
    [[nodiscard]] RefereeFindings finish();

    /// The smoothed envelope of every frame from the first one added, uV, NaN where missing; after `finish`.
    [[nodiscard]] const std::vector<float>& envelope() const noexcept { return envelope_; }

  private:
    Referee(const RefereeSettings& settings, const Channels& channels, Hertz rate, BandPass band);
    void skip(std::uint64_t frames);
    [[nodiscard]] bool missing(std::span<const float> frame) const noexcept;

    RefereeSettings settings_;
    Hertz rate_;
    std::vector<std::size_t> sites_, used_; // channels by place in the frame
    ZeroPhaseEnergy energy_;
    std::vector<double> frame_;
    std::vector<float> envelope_; // energies until finish
    SampleIndex first_{}, next_{};
    bool begun_ = false;
    bool in_run_ = false;
};

/// The whole recording at once.
[[nodiscard]] RefereeFindings find_ripples(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                                           const FrameBlock& recording);

} // namespace millpond
