// What a user may say about everything in an invented recording that is neither ripple nor plain background: rhythms,
// bursts, artefacts and faults. Thread: control. What a paper gives names it; everything else is invented.
#pragma once

#include "base/describe.hpp"

namespace millpond {

enum class AnimalState : unsigned char {
    rest,
    run
};

inline constexpr Choice<AnimalState> animal_states[] = {{AnimalState::rest, "rest"}, {AnimalState::run, "run"}};

struct StateSettings {
    AnimalState first = AnimalState::rest;
    double rest_s = 20.0; // invented, as all of this group
    double run_s = 0.0;
    double length_log_sd = 0.5;
    double change_s = 0.5;
    double ripples_in_run = 0.0;

    bool operator==(const StateSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, StateSettings& states) {
    visit.choice("first", states.first, animal_states, "state in which the recording begins");
    visit.number("rest_s", states.rest_s, {0.0, 1e6}, "mean length (log-normal) of rest: delta, ripples; 0: no rest");
    visit.number("run_s", states.run_s, {0.0, 1e6},
                 "mean length (log-normal) of running: theta; 0: no states, theta and delta go on throughout");
    visit.number("length_log_sd", states.length_log_sd, {0.0, 1.5}, "deviation of the natural logarithm of both");
    visit.number("change_s", states.change_s, {0.01, 10.0}, "time in which theta and delta rise and fall at a change");
    visit.number("ripples_in_run", states.ripples_in_run, {0.0, 1.0}, "rate of ripples in running, as a share");
}

struct ThetaSettings {
    double amplitude_uv = 0.0;
    double frequency_hz = 7.5;
    double wander_hz = 0.4;

    bool operator==(const ThetaSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ThetaSettings& theta) {
    visit.number("amplitude_uv", theta.amplitude_uv, {0.0, 10000.0}, "size of theta; half of it on the reference");
    visit.number("frequency_hz", theta.frequency_hz, {3.0, 15.0}, "mean frequency");
    visit.number("wander_hz", theta.wander_hz, {0.0, 2.0}, "deviation of the frequency, which wanders within a second");
}

struct DeltaSettings {
    double rms_uv = 0.0;
    double frequency_hz = 2.0; // common practice: 1-4 Hz
    double width_hz = 0.7;
    double reference_share = 1.0;

    bool operator==(const DeltaSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, DeltaSettings& delta) {
    visit.number("rms_uv", delta.rms_uv, {0.0, 10000.0}, "size of slow waves");
    visit.number("frequency_hz", delta.frequency_hz, {0.5, 6.0}, "middle frequency");
    visit.number("width_hz", delta.width_hz, {0.1, 3.0}, "half width of their spectrum at half its power");
    visit.number("reference_share", delta.reference_share, {0.0, 5.0}, "their size on the reference, as a share");
}

struct GammaSettings {
    double rate_per_s = 0.0;
    double low_hz = 90.0; // Sullivan et al. 2011, J Neurosci 31:8605: fast gamma 90-140 Hz, ripples 140-220 Hz
    double high_hz = 140.0;
    double amplitude_uv = 80.0;
    double amplitude_log_sd = 0.4;
    double duration_ms = 80.0;
    double duration_log_sd = 0.4;
    double depth_um = 60.0;
    double spread_um = 120.0;
    double reference_share = 0.1;

    bool operator==(const GammaSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, GammaSettings& gamma) {
    visit.number("rate_per_s", gamma.rate_per_s, {0.0, 10.0}, "bursts a second");
    visit.number("low_hz", gamma.low_hz, {20.0, 1000.0}, "lowest frequency of a burst");
    visit.number("high_hz", gamma.high_hz, {20.0, 1000.0}, "highest frequency of a burst; each has one in between");
    visit.number("amplitude_uv", gamma.amplitude_uv, {0.0, 10000.0}, "median peak envelope (log-normal) where largest");
    visit.number("amplitude_log_sd", gamma.amplitude_log_sd, {0.0, 2.0}, "deviation of its natural logarithm");
    visit.number("duration_ms", gamma.duration_ms, {10.0, 2000.0}, "median length (log-normal) under a Hann window");
    visit.number("duration_log_sd", gamma.duration_log_sd, {0.0, 1.5}, "deviation of its natural logarithm");
    visit.number("depth_um", gamma.depth_um, {-10000.0, 10000.0},
                 "distance below the pyramidal layer's middle where bursts are largest");
    visit.number("spread_um", gamma.spread_um, {1.0, 10000.0}, "distance from there at which they have 0.61 of it");
    visit.number("reference_share", gamma.reference_share, {0.0, 5.0}, "their size on the reference, as a share");
}

// Complex-spike bursts: 3-6 spikes 2-6 ms apart, each smaller than the last; from memory. The rest is invented.
struct SpikeBurstSettings {
    double share_of_cycles = 0.0;
    double amplitude_uv = 400.0;
    double amplitude_log_sd = 0.4;
    double decline = 0.15;
    double width_ms = 1.0;
    int least_spikes = 3;
    int most_spikes = 6;
    double least_interval_ms = 2.0;
    double most_interval_ms = 6.0;
    double phase_turns = 0.5;
    double phase_sd_turns = 0.08;
    int site = 1;
    double spread_um = 40.0;

    bool operator==(const SpikeBurstSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SpikeBurstSettings& bursts) {
    visit.number("share_of_cycles", bursts.share_of_cycles, {0.0, 1.0}, "share of theta's cycles that hold a burst");
    visit.number("amplitude_uv", bursts.amplitude_uv, {0.0, 100000.0},
                 "median peak (log-normal) of a burst's first spike, on its site");
    visit.number("amplitude_log_sd", bursts.amplitude_log_sd, {0.0, 2.0}, "deviation of its natural logarithm");
    visit.number("decline", bursts.decline, {0.0, 0.9}, "share by which each spike is smaller than the last");
    visit.number("width_ms", bursts.width_ms, {0.2, 5.0}, "width of a spike, which is negative, then positive");
    visit.whole("least_spikes", bursts.least_spikes, {1, 50}, "fewest spikes of a burst");
    visit.whole("most_spikes", bursts.most_spikes, {1, 50}, "most spikes of a burst");
    visit.number("least_interval_ms", bursts.least_interval_ms, {0.5, 50.0}, "shortest time between two of them");
    visit.number("most_interval_ms", bursts.most_interval_ms, {0.5, 50.0}, "longest time between two of them");
    visit.number("phase_turns", bursts.phase_turns, {0.25, 0.75}, "part of theta's cycle at which bursts begin");
    visit.number("phase_sd_turns", bursts.phase_sd_turns, {0.0, 0.1}, "deviation of that from burst to burst");
    visit.whole("site", bursts.site, {1, 256}, "site where the spikes are largest");
    visit.number("spread_um", bursts.spread_um, {1.0, 10000.0}, "distance in which they fall to 0.37");
}

struct MainsSettings {
    double amplitude_uv = 0.0;
    double frequency_hz = 50.0;
    double second_harmonic = 0.0;
    double third_harmonic = 0.3;
    double fourth_harmonic = 0.0;
    double fifth_harmonic = 0.15;
    double drift_log_sd = 0.0;
    double drift_s = 60.0;

    bool operator==(const MainsSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, MainsSettings& mains) {
    visit.number("amplitude_uv", mains.amplitude_uv, {0.0, 10000.0}, "size of mains hum, the same on all channels");
    visit.number("frequency_hz", mains.frequency_hz, {10.0, 100.0}, "frequency of the mains");
    visit.number("second_harmonic", mains.second_harmonic, {0.0, 1.0}, "size of its second harmonic, as a share");
    visit.number("third_harmonic", mains.third_harmonic, {0.0, 1.0}, "size of its third harmonic, as a share");
    visit.number("fourth_harmonic", mains.fourth_harmonic, {0.0, 1.0}, "size of its fourth harmonic, as a share");
    visit.number("fifth_harmonic", mains.fifth_harmonic, {0.0, 1.0}, "size of its fifth harmonic, as a share");
    visit.number("drift_log_sd", mains.drift_log_sd, {0.0, 2.0}, "deviation of the natural logarithm of its size");
    visit.number("drift_s", mains.drift_s, {1.0, 1e5}, "time in which the size goes up and down once, about");
}

struct ArtefactSettings {
    double steps_per_min = 0.0;
    double site_steps_per_min = 0.0;
    double step_uv = 3000.0;
    double step_recovery_ms = 300.0;
    double spikes_per_min = 0.0;
    double spike_uv = 1500.0;
    double spike_least_ms = 0.2;
    double spike_most_ms = 1.0;
    double muscle_per_min = 0.0;
    double muscle_uv = 200.0;
    double muscle_log_sd = 0.0;
    double muscle_ms = 300.0;
    double muscle_low_hz = 60.0;
    double muscle_high_hz = 400.0;
    double muscle_own = 0.0;
    double muscle_reference = 1.0;
    double chewing_share = 0.0;
    double chewing_ms = 200.0; // from memory: rats chew 4-6 times a second

    bool operator==(const ArtefactSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ArtefactSettings& artefacts) {
    visit.number("steps_per_min", artefacts.steps_per_min, {0.0, 600.0}, "sudden steps, the same on all channels");
    visit.number("site_steps_per_min", artefacts.site_steps_per_min, {0.0, 600.0}, "sudden steps of one channel alone");
    visit.number("step_uv", artefacts.step_uv, {0.0, 100000.0}, "height of a step, up or down");
    visit.number("step_recovery_ms", artefacts.step_recovery_ms, {1.0, 60000.0}, "time constant of the return from it");
    visit.number("spikes_per_min", artefacts.spikes_per_min, {0.0, 600.0}, "single large spikes of one channel alone");
    visit.number("spike_uv", artefacts.spike_uv, {0.0, 100000.0}, "peak of such a spike before the amplifier's filter");
    visit.number("spike_least_ms", artefacts.spike_least_ms, {0.1, 10.0}, "least width of such a spike");
    visit.number("spike_most_ms", artefacts.spike_most_ms, {0.1, 10.0}, "largest width of such a spike");
    visit.number("muscle_per_min", artefacts.muscle_per_min, {0.0, 600.0},
                 "bursts of fast noise as from muscles, on all channels");
    visit.number("muscle_uv", artefacts.muscle_uv, {0.0, 100000.0}, "median rms (log-normal) in the middle of a burst");
    visit.number("muscle_log_sd", artefacts.muscle_log_sd, {0.0, 2.0}, "deviation of its natural logarithm");
    visit.number("muscle_ms", artefacts.muscle_ms, {10.0, 10000.0}, "length of a burst");
    visit.number("muscle_low_hz", artefacts.muscle_low_hz, {1.0, 1000.0}, "its power falls below this frequency");
    visit.number("muscle_high_hz", artefacts.muscle_high_hz, {10.0, 5000.0}, "and above this one");
    visit.number("muscle_own", artefacts.muscle_own, {0.0, 1.0}, "share of its variance that each channel has alone");
    visit.number("muscle_reference", artefacts.muscle_reference, {0.0, 20.0}, "its size on the reference, as a share");
    visit.number("chewing_share", artefacts.chewing_share, {0.0, 0.95},
                 "share of bursts that another follows, as in "
                 "chewing");
    visit.number("chewing_ms", artefacts.chewing_ms, {10.0, 10000.0}, "time from one such burst's begin to the next's");
}

struct GainDriftSettings {
    double log_sd = 0.0; // invented
    double period_s = 300.0;

    bool operator==(const GainDriftSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, GainDriftSettings& drift) {
    visit.number("log_sd", drift.log_sd, {0.0, 2.0}, "deviation of the natural logarithm of each channel's gain");
    visit.number("period_s", drift.period_s, {1.0, 1e5}, "time in which a gain goes up and down once, about");
}

/// What a channel shows when it is no longer of use.
enum class FaultKind : unsigned char {
    flat,   ///< 0 throughout
    railed, ///< stuck at the amplifier's limit
    huge,   ///< an open input: white noise far above any signal
};

inline constexpr Choice<FaultKind> fault_kinds[] = {
    {FaultKind::flat, "flat"}, {FaultKind::railed, "railed"}, {FaultKind::huge, "huge"}};

struct FaultSettings {
    int dead_site = 0;
    FaultKind dead_kind = FaultKind::flat;
    int failing_site = 0;
    FaultKind failing_kind = FaultKind::flat;
    double failing_at_s = 60.0;
    double rail_uv = 5000.0; // invented, as is the next
    double huge_uv = 1500.0;

    bool operator==(const FaultSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FaultSettings& faults) {
    visit.whole("dead_site", faults.dead_site, {0, 256}, "site that is dead from the start; 0: none");
    visit.choice("dead_kind", faults.dead_kind, fault_kinds, "what it shows");
    visit.whole("failing_site", faults.failing_site, {0, 256}, "site that fails on the way; 0: none");
    visit.choice("failing_kind", faults.failing_kind, fault_kinds, "what it shows from then on");
    visit.number("failing_at_s", faults.failing_at_s, {0.0, 1e6}, "when it fails");
    visit.number("rail_uv", faults.rail_uv, {0.0, 100000.0}, "value of a railed site");
    visit.number("huge_uv", faults.huge_uv, {0.0, 100000.0}, "rms of a huge site's noise");
}

} // namespace millpond
