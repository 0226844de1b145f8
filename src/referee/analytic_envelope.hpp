// Magnitude of the analytic signal, mean over sites, of a band signal that comes frame by frame. Thread: cold.
//
// The quarter-cycle shift is a linear-phase FIR Hilbert transformer (type III, odd taps of 2 / (pi n) under a Kaiser
// window), exact to 0.1 % above half of the band's lower edge and as far below half the rate. Chosen instead of the
// transform of the whole recording, which would not fit in memory; both agree to that share away from the ends.
#pragma once

#include "base/units.hpp"

#include <cstddef>
#include <span>
#include <vector>

namespace millpond {

class AnalyticEnvelope {
  public:
    /// `low`: the band's lower edge.
    AnalyticEnvelope(Hertz low, Hertz rate, std::size_t sites);

    /// One value a site. Envelopes come out behind `envelope` in order, some of them at a later call.
    void add(std::span<const double> frame, std::vector<float>& envelope);

    /// The run of frames is over: the rest comes out, as if zeros followed; the next `add` begins a new run.
    void end_run(std::vector<float>& envelope);

  private:
    void answer(std::vector<float>& envelope);
    void begin_run();

    std::size_t sites_;
    std::vector<float> taps_;  // for distances 1, 3, 5, ... frames
    std::size_t radius_;       // frames on each side
    std::vector<float> waits_; // frames around the next one to answer; zeros before the run
    std::vector<float> shifted_;
    std::size_t next_ = 0; // place in `waits_` of the next frame to answer
    bool running_ = false;
};

} // namespace millpond
