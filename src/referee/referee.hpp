// The referee: non-causal re-detection of ripples, the truth on recordings without labels.
//
// Zero-phase Butterworth band-pass; one envelope of all ripple sites; a floor taken over the whole recording;
// thresholds for peak and edges; merging; shortest duration. Which values, by which rule: referee_rules.hpp. The
// envelope comes in either of two ways. `summed_energy` (square, sum, Gaussian, square root) is scaled so that a sine
// of A uV on every site comes out as A uV, which moves no threshold; smoothing that covers half a cycle of the band
// makes it the smoothed analytic envelope. `mean_analytic` averages the magnitudes of the sites' analytic signals, then
// smooths.
//
// Frames with a non-finite value on a ripple or reference channel are missing, and so are frames left out between
// blocks: no ripple crosses them and the statistics skip them. Artefacts (artefacts.hpp) are out of the statistics, and
// an event that touches one is dropped, whole. Channels of role unused are not looked at; those of role reference only
// for what is missing and for artefacts.
#pragma once

#include "base/channels.hpp"
#include "base/frames.hpp"
#include "referee/analytic_envelope.hpp"
#include "referee/artefacts.hpp"
#include "referee/envelope_rules.hpp"
#include "referee/referee_settings.hpp"
#include "referee/ripple.hpp"
#include "referee/zero_phase.hpp"

#include <string>
#include <vector>

namespace millpond {

struct RefereeFindings {
    Ripples ripples;
    double floor = 0.0;              ///< mean or median of the envelope, uV
    double spread = 0.0;             ///< what thresholds are counted in: SD, or third quartile - median, uV
    std::uint64_t frames_judged = 0; ///< neither missing nor excluded
    ArtefactFindings artefacts;
    std::uint64_t dropped_events = 0; ///< ripples but for an artefact that they touch
};

/// Takes a recording block by block, answers at its end. Thread: one, cold. Memory: 8 bytes a frame, whatever the
/// number of channels, a few seconds of the channels' signal, and what artefacts.hpp says.
class Referee {
  public:
    /// Refuses values that are not those of their rule, a band that the rate cannot carry, edges above the peak,
    /// clipping below 1 SD, energies smoothed for less than half a cycle's worth (240 / low_hz ms), and channels
    /// without a ripple site. `where` names the settings for the message.
    static Referee make(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                        const std::string& where = "referee");

    /// Blocks in order; a block may start later than the last one ended, never earlier.
    void add(const FrameBlock& block);

    /// Ends the recording. Call once.
    [[nodiscard]] RefereeFindings finish();

    /// The smoothed envelope of every frame from the first one added, uV, NaN where missing; after `finish`.
    [[nodiscard]] const std::vector<float>& envelope() const noexcept { return envelope_; }

  private:
    struct Used {
        std::vector<std::size_t> channels; // by place in the frame: ripple sites first, then references
        std::size_t sites = 0;
    };
    static Used used_of(const Channels& channels);
    Referee(const RefereeSettings& settings, Used used, Hertz rate, BandPass band);
    void skip(std::uint64_t frames);
    void end_run();
    void take_band();
    void smooth();
    [[nodiscard]] Floor floor_without(const Intervals& excluded) const;
    [[nodiscard]] bool missing(std::span<const float> frame) const noexcept;

    RefereeSettings settings_;
    Hertz rate_;
    Used used_;
    ZeroPhaseBand band_;
    AnalyticEnvelope analytic_;
    ArtefactWatch watch_;
    std::vector<double> frame_, passed_; // one raw frame of the used channels, and what the band-pass let out
    std::vector<float> envelope_;        // not smoothed until finish
    SampleIndex first_{}, next_{};
    bool begun_ = false;
    bool in_run_ = false;
};

/// The whole recording at once.
[[nodiscard]] RefereeFindings find_ripples(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                                           const FrameBlock& recording, const std::string& where = "referee");

} // namespace millpond
