// What a user may say about an invented recording. Thread: control.
// Defaults: what a paper gives names it; everything else is invented to look like rat CA1 at rest.
#pragma once

#include "base/describe.hpp"
#include "synth/disturbance_settings.hpp"

#include <cstdint>

namespace millpond {

struct BackgroundSettings {
    double rms_uv = 250.0;
    double slope = 1.5;
    double corner_hz = 0.5;
    double shared = 0.7;
    double correlation_um = 0.0;
    double amplifier_uv = 3.0;

    bool operator==(const BackgroundSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, BackgroundSettings& background) {
    visit.number("rms_uv", background.rms_uv, {0.0, 10000.0}, "size of the background");
    visit.number("slope", background.slope, {0.0, 2.0}, "its power falls with frequency to this power");
    visit.number("corner_hz", background.corner_hz, {0.05, 50.0}, "below this frequency its power is flat");
    visit.number("shared", background.shared, {0.0, 1.0}, "share of its variance that all channels have in common");
    visit.number("correlation_um", background.correlation_um, {0.0, 1e6},
                 "distance in which the correlation of that share falls to 0.37; 0: it does not fall");
    visit.number("amplifier_uv", background.amplifier_uv, {0.0, 1000.0}, "white noise of each channel's own, rms");
}

struct RippleSettings {
    double rate_per_s = 0.5; // Deceuninck & Kloosterman 2024 quote about 0.5 in NREM sleep, 0.58-0.66 awake at rest
    double min_gap_ms = 100.0;
    double amplitude_uv = 160.0;    // Deceuninck & Kloosterman 2024: median 160, quartiles 118 and 195
    double amplitude_log_sd = 0.37; // ln(195 / 118) / (2 x 0.6745), from those quartiles
    double duration_ms = 96.7;      // Deceuninck & Kloosterman 2024: mean 96.7 ms with edges at the mean envelope
    // The same paper has 26 % longer than 100 ms. With that mean, log-normal laws with a log SD of 0.05 or 1.23 would
    // give it, neither of which looks like ripples; this invented 0.45 gives 38 %.
    double duration_log_sd = 0.45;
    double rise_share = 0.4;
    double start_hz = 195.0; // Nguyen et al. 2009 for the fall itself; its size from memory
    double end_hz = 150.0;
    double frequency_sd_hz = 8.0;
    double spread_um = 120.0;
    double depth_sd_um = 0.0;      // invented: where a ripple is largest is not the same each time
    double doublet_share = 0.0;    // common practice: doublets and triplets 100-200 ms apart are common
    double doublet_least_ms = 100; // from memory
    double doublet_most_ms = 200;  // from memory
    double small_share = 0.0;      // invented
    double small_size = 0.4;       // invented

    bool operator==(const RippleSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RippleSettings& ripples) {
    visit.number("rate_per_s", ripples.rate_per_s, {0.0, 5.0}, "ripples a second after the quiet start");
    visit.number("min_gap_ms", ripples.min_gap_ms, {0.0, 10000.0},
                 "least time from one ripple's end to the next's onset");
    visit.number("amplitude_uv", ripples.amplitude_uv, {0.0, 10000.0},
                 "median peak envelope (log-normal) in the middle of the pyramidal layer");
    visit.number("amplitude_log_sd", ripples.amplitude_log_sd, {0.0, 2.0}, "deviation of its natural logarithm");
    visit.number("duration_ms", ripples.duration_ms, {5.0, 1000.0},
                 "mean duration (log-normal) between the envelope's tenths of its peak");
    visit.number("duration_log_sd", ripples.duration_log_sd, {0.0, 1.5}, "deviation of its natural logarithm");
    visit.number("rise_share", ripples.rise_share, {0.05, 0.95}, "share of a ripple that lies before its peak");
    visit.number("start_hz", ripples.start_hz, {20.0, 1000.0}, "mean frequency at the onset");
    visit.number("end_hz", ripples.end_hz, {20.0, 1000.0}, "mean frequency at the end; in between it changes evenly");
    visit.number("frequency_sd_hz", ripples.frequency_sd_hz, {0.0, 100.0}, "deviation of both from ripple to ripple");
    visit.number("spread_um", ripples.spread_um, {1.0, 10000.0},
                 "distance from the layer's middle at which ripples have 0.61 of their size");
    visit.number("depth_sd_um", ripples.depth_sd_um, {0.0, 1000.0},
                 "deviation, from ripple to ripple, of the depth at which one is largest");
    visit.number("doublet_share", ripples.doublet_share, {0.0, 0.8},
                 "share of ripples that another follows soon: doublets, triplets, more");
    visit.number("doublet_least_ms", ripples.doublet_least_ms, {20.0, 1000.0},
                 "least time from one onset to the next within a doublet, but never before the first has ended");
    visit.number("doublet_most_ms", ripples.doublet_most_ms, {20.0, 1000.0}, "most time from one onset to the next");
    visit.number("small_share", ripples.small_share, {0.0, 1.0}, "share of ripples that are small");
    visit.number("small_size", ripples.small_size, {0.05, 1.0}, "their size, as a share of what it would have been");
}

struct SharpWaveSettings {
    double amplitude_uv = 300.0;
    double duration_ms = 80.0; // Liu et al. 2022; Chrobak & Buzsaki 1996: 40-120 ms, negative in stratum radiatum
    double depth_um = 150.0;

    bool operator==(const SharpWaveSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SharpWaveSettings& sharp_wave) {
    visit.number("amplitude_uv", sharp_wave.amplitude_uv, {0.0, 10000.0},
                 "size, where it is largest, with a ripple of median amplitude; grows with its ripple");
    visit.number("duration_ms", sharp_wave.duration_ms, {10.0, 500.0}, "whole length, centred on the ripple's peak");
    visit.number("depth_um", sharp_wave.depth_um, {1.0, 10000.0},
                 "distance below the layer's middle where it is most negative; as far above it is most positive");
}

struct SceneSettings {
    double duration_s = 60.0;
    double rate_hz = 1250.0;
    std::uint64_t seed = 1;
    int sites = 4;
    bool reference = false;
    double site_spacing_um = 40.0;
    double reference_um = 1500.0; // invented: cortex above dorsal CA1 of a rat
    double quiet_start_s = 15.0;
    BackgroundSettings background;
    RippleSettings ripples;
    SharpWaveSettings sharp_wave;
    StateSettings states;
    ThetaSettings theta;
    DeltaSettings delta;
    GammaSettings gamma;
    SpikeBurstSettings spike_bursts;
    MainsSettings mains;
    ArtefactSettings artefacts;
    GainDriftSettings gain_drift;
    FaultSettings faults;

    bool operator==(const SceneSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SceneSettings& scene) {
    visit.number("duration_s", scene.duration_s, {0.1, 1e6}, "length of the recording");
    visit.number("rate_hz", scene.rate_hz, {500.0, 50000.0}, "frames a second");
    visit.whole("seed", scene.seed, {0, 9007199254740992.0}, "the same seed gives the same recording on every machine");
    visit.whole("sites", scene.sites, {1, 256}, "channels of role ripple, spread evenly about the pyramidal layer");
    visit.flag("reference", scene.reference, "one more channel, of role reference, far from the ripples");
    visit.number("site_spacing_um", scene.site_spacing_um, {0.0, 1000.0}, "distance between neighbouring sites");
    visit.number("reference_um", scene.reference_um, {0.0, 1e6}, "distance from the uppermost site to the reference");
    visit.number("quiet_start_s", scene.quiet_start_s, {0.0, 3600.0}, "no ripples before, so that a floor can settle");
    visit.group("background", scene.background, "what is there without ripples");
    visit.group("ripples", scene.ripples, "the events to find");
    visit.group("sharp_wave", scene.sharp_wave, "the slow deflection under each ripple");
    visit.group("states", scene.states, "rest and running by turns");
    visit.group("theta", scene.theta, "rhythm of running");
    visit.group("delta", scene.delta, "slow waves of rest");
    visit.group("gamma", scene.gamma, "bursts of fast gamma, below the ripple band");
    visit.group("spike_bursts", scene.spike_bursts, "bursts of large spikes locked to theta, which leak into the band");
    visit.group("mains", scene.mains, "hum");
    visit.group("artefacts", scene.artefacts, "what looks like ripples and is none");
    visit.group("gain_drift", scene.gain_drift, "each site's own slow change of gain");
    visit.group("faults", scene.faults, "sites that are dead or fail");
}

} // namespace millpond
