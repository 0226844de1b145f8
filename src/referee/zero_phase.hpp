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

/// Sum over sites of the squared zero-phase band signal, frame by frame, for one run of frames after another.
/// Each run starts and ends as if its first and last value had stood there for ever, so no step rings at its edges.
class ZeroPhaseEnergy {
  public:
    ZeroPhaseEnergy(BandPass band, std::size_t sites);

    /// One value a site. Energies come out in order, some of them at a later call.
    void add(std::span<const double> frame, std::vector<float>& energies);

    /// The run of frames is over: what is still inside comes out, and the next `add` begins a new run.
    void end_run(std::vector<float>& energies);

  private:
    void forward(std::span<const double> frame);
    void backward(std::size_t frames, bool at_end, std::size_t wanted, std::vector<float>& energies);
    void filter(std::span<double> frame, std::vector<double>& state) const;

    BandPass band_;
    std::size_t sites_;
    std::size_t look_ahead_; // frames after which the backward pass has forgotten where it began
    std::size_t chunk_;
    std::vector<double> origin_;        // first frame of the run
    std::vector<double> forward_state_; // section by section, two values a site
    std::vector<double> backward_state_;
    std::vector<double> passed_; // forward-filtered frames that wait for their backward pass
    std::vector<double> scratch_;
};

} // namespace millpond
