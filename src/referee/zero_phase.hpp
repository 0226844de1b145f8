// Zero-phase band-pass: forward and backward over all sites at once, in chunks, so that hours fit in memory.
// Its design is its own, not the detector's: an error in one does not hide the same error in the other. Thread: cold.
#pragma once

#include "base/units.hpp"

#include <cstddef>
#include <span>
#include <vector>

namespace millpond {

/// One section g (1 - z^-2) / (1 + a1 z^-1 + a2 z^-2) of a Butterworth band-pass.
struct BandSection {
    double gain, a1, a2;
};

struct BandPass {
    std::vector<BandSection> sections;
    double slowest_pole = 0.0; ///< largest magnitude of all poles

    /// Frames until the response has died down to `share` of its start.
    [[nodiscard]] std::size_t frames_to_decay(double share) const;
};

/// Butterworth band-pass by bilinear transform with prewarped edges; gain 1 at the band's centre.
/// Needs 0 < low < high < rate / 2.
[[nodiscard]] BandPass butterworth_band_pass(Hertz low, Hertz high, int order, Hertz rate);

/// The zero-phase band signal of all channels, for one run of frames after another.
/// Each run starts and ends as if its first and last value had stood there for ever, so no step rings at its edges.
class ZeroPhaseBand {
  public:
    ZeroPhaseBand(BandPass band, std::size_t channels);

    /// One value a channel. Frames come out behind `passed` in order, shape as they go in, some of them at a later
    /// call.
    void add(std::span<const double> frame, std::vector<double>& passed);

    /// The run of frames is over: what is still inside comes out, and the next `add` begins a new run.
    void end_run(std::vector<double>& passed);

  private:
    void forward(std::span<const double> frame);
    void backward(std::size_t frames, bool at_end, std::size_t wanted, std::vector<double>& out);
    void filter(std::span<double> frame, std::vector<double>& state) const;

    BandPass band_;
    std::size_t channels_;
    std::size_t look_ahead_; // frames after which the backward pass has forgotten where it began
    std::size_t chunk_;
    std::vector<double> origin_;        // first frame of the run
    std::vector<double> forward_state_; // section by section, two values a channel
    std::vector<double> backward_state_;
    std::vector<double> passed_; // forward-filtered frames that wait for their backward pass
    std::vector<double> scratch_;
};

} // namespace millpond
