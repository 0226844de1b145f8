// What a user may say about the referee. Thread: control.
//
// The default rule is a mix, named part by part:
//   envelope  150-250 Hz, squared, summed over sites, Gaussian of SD 4 ms, square root, as in Gillespie et al. 2024
//             (eLife 90944);
//   floor     clipped before mean and SD are taken; peak at 5 SD, edges at 1 SD; events nearer than 15 ms merged,
//             shorter than 15 ms dropped, as in Stark et al. 2014 (Neuron 83:467; from memory), but clipped at 3 SD,
//             not 4, and again until nothing moves: ripples that fill a share p of the time raise the SD by 1/sqrt(1 -
//             c^2 p) with clipping at c SD (derived), for p = 5 % by 1.3 at 3 SD and by 2.2 at 4;
//   order     3, forward and backward: chosen here, so that 120 Hz comes out below 2 %.
// On Gaussian noise alone the default finds up to 0.9 events a minute with one site and 0.2 with four (NumPy, an hour
// at 1250 Hz). Published thresholds span 2-7 SD and give rates 100-fold apart (Liu et al. 2022, Nat Commun 13:6000):
// say which rule a figure was made with.
#pragma once

#include "base/describe.hpp"

namespace millpond {

struct RefereeSettings {
    double low_hz = 150.0;
    double high_hz = 250.0;
    int order = 3;
    double smoothing_ms = 4.0;
    double clip_deviations = 3.0;
    double peak_deviations = 5.0;
    double edge_deviations = 1.0;
    double min_duration_ms = 15.0;
    double merge_gap_ms = 15.0;

    bool operator==(const RefereeSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RefereeSettings& referee) {
    visit.number("low_hz", referee.low_hz, {1.0, 20000.0},
                 "lower edge of the zero-phase Butterworth band-pass (-6 dB, since it runs forward and backward)");
    visit.number("high_hz", referee.high_hz, {2.0, 24000.0}, "upper edge, likewise; below half the rate");
    visit.whole("order", referee.order, {1, 8}, "order of the low-pass prototype, of each of the two passes");
    visit.number("smoothing_ms", referee.smoothing_ms, {0.1, 100.0}, "SD of the Gaussian that smooths the energy");
    visit.number("clip_deviations", referee.clip_deviations, {1.0, 1000.0},
                 "envelopes further than this above the mean enter mean and SD as this far");
    visit.number("peak_deviations", referee.peak_deviations, {0.1, 100.0},
                 "a ripple's envelope reaches this many SD above the mean");
    visit.number("edge_deviations", referee.edge_deviations, {0.0, 100.0},
                 "a ripple lasts while its envelope is this many SD above the mean; at most `peak_deviations`");
    visit.number("min_duration_ms", referee.min_duration_ms, {0.0, 1000.0},
                 "shorter events are dropped, after merging");
    visit.number("merge_gap_ms", referee.merge_gap_ms, {0.0, 1000.0}, "events nearer to each other are one ripple");
}

} // namespace millpond
