// What a user may say about the detector. Thread: control.
#pragma once

#include "base/describe.hpp"
#include "detector/evidence_settings.hpp"
#include "detector/mains_removal_settings.hpp"
#include "detector/state_gate_settings.hpp"

#include <cstdint>
#include <string>

namespace millpond {

enum class FilterFamily : std::uint8_t {
    butterworth,      ///< flattest pass band; the shortest delay of the three at equal order
    chebyshev2,       ///< flat pass band, stop band held below stopband_db
    elliptic,         ///< steepest edges; ripples in both bands; the longest delay at its edges
    fir_minimum_phase ///< finite response, delay as short as its magnitude permits
};
inline constexpr Choice<FilterFamily> filter_families[] = {{FilterFamily::butterworth, "butterworth"},
                                                           {FilterFamily::chebyshev2, "chebyshev2"},
                                                           {FilterFamily::elliptic, "elliptic"},
                                                           {FilterFamily::fir_minimum_phase, "fir_minimum_phase"}};

struct FilterSettings {
    FilterFamily family = FilterFamily::butterworth;
    double low_hz = 150.0;
    double high_hz = 250.0;
    int order = 1; ///< of the low-pass prototype: the band-pass has twice as many poles
    double stopband_db = 40.0;
    double passband_ripple_db = 0.5;
    double transition_hz = 60.0;

    bool operator==(const FilterSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FilterSettings& filter) {
    visit.choice("family", filter.family, filter_families, "kind of causal band-pass");
    visit.number("low_hz", filter.low_hz, {1.0, 20000.0},
                 "lower edge of the band (-3 dB for butterworth, edge of the stop band for chebyshev2)");
    visit.number("high_hz", filter.high_hz, {2.0, 24000.0}, "upper edge of the band, likewise; below half the rate");
    visit.whole("order", filter.order, {1, 8},
                "order of the low-pass prototype; the band-pass has twice as many poles");
    visit.number("stopband_db", filter.stopband_db, {10.0, 120.0},
                 "how far the stop band lies below the pass band (chebyshev2, elliptic, fir_minimum_phase)");
    visit.number("passband_ripple_db", filter.passband_ripple_db, {0.01, 3.0}, "ripple of the pass band (elliptic)");
    visit.number("transition_hz", filter.transition_hz, {5.0, 5000.0},
                 "width between pass and stop band (fir_minimum_phase)");
}

enum class EnvelopeMethod : std::uint8_t {
    rectify, ///< absolute value, smoothed
    energy,  ///< square, smoothed, square root
    analytic ///< magnitude with a quadrature filter, smoothed
};
inline constexpr Choice<EnvelopeMethod> envelope_methods[] = {
    {EnvelopeMethod::rectify, "rectify"}, {EnvelopeMethod::energy, "energy"}, {EnvelopeMethod::analytic, "analytic"}};

struct EnvelopeSettings {
    EnvelopeMethod method = EnvelopeMethod::analytic;
    double smoothing_ms = 8.0;

    bool operator==(const EnvelopeSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, EnvelopeSettings& envelope) {
    visit.choice("method", envelope.method, envelope_methods, "how the envelope is taken from the band-passed signal");
    visit.number("smoothing_ms", envelope.smoothing_ms, {0.0, 100.0},
                 "delay that the smoother adds: two equal one-pole sections, half of it each; 0 is none");
}

struct FloorSettings {
    double time_constant_s = 20.0;
    double clip_deviations = 2.0;
    double settle_s = 10.0;
    double freeze_ms = 50.0;
    std::string warm_start_session;

    bool operator==(const FloorSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FloorSettings& floor) {
    visit.number("time_constant_s", floor.time_constant_s, {0.1, 3600.0},
                 "time constant of the running mean and deviation of the envelope");
    visit.number("clip_deviations", floor.clip_deviations, {1.0, 1000.0},
                 "an envelope further than this from the mean enters the statistics as this far");
    visit.number("settle_s", floor.settle_s, {0.1, 3600.0}, "clean signal needed before triggers are let through");
    visit.number("freeze_ms", floor.freeze_ms, {0.0, 10000.0}, "statistics stand still this long after a detection");
    visit.text("warm_start_session", floor.warm_start_session,
               "session folder whose last floor this one starts from; empty: from nothing");
}

struct ThresholdSettings {
    double deviations = 6.0;
    double rearm_deviations = 3.0;
    double min_above_ms = 0.0;

    bool operator==(const ThresholdSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ThresholdSettings& threshold) {
    visit.number("deviations", threshold.deviations, {0.1, 100.0}, "threshold, in deviations above the floor's mean");
    visit.number("rearm_deviations", threshold.rearm_deviations, {0.0, 100.0},
                 "the envelope must fall below this before the detector can cross again; at most `deviations`");
    visit.number("min_above_ms", threshold.min_above_ms, {0.0, 200.0},
                 "the envelope must stay above the threshold this long; 0: one sample is enough");
}

enum class VoteRule : std::uint8_t {
    count, ///< at least sites_needed ripple sites above their own thresholds
    mean   ///< the mean of the ripple sites' envelopes above its own threshold
};
inline constexpr Choice<VoteRule> vote_rules[] = {{VoteRule::count, "count"}, {VoteRule::mean, "mean"}};

struct VoteSettings {
    VoteRule rule = VoteRule::mean;
    int sites_needed = 1;

    bool operator==(const VoteSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, VoteSettings& vote) {
    visit.choice("rule", vote.rule, vote_rules, "how the ripple sites decide together");
    visit.whole("sites_needed", vote.sites_needed, {1, 256}, "ripple sites that must be above at once (rule: count)");
}

struct VetoSettings {
    double deviations = 4.0;
    double window_ms = 20.0;

    bool operator==(const VetoSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, VetoSettings& veto) {
    visit.number("deviations", veto.deviations, {0.1, 1000.0},
                 "threshold of a reference channel, in deviations above its own floor");
    visit.number("window_ms", veto.window_ms, {0.0, 1000.0},
                 "a reference channel above its threshold within this time before a detection vetoes it");
}

enum class DetectionMethod : std::uint8_t {
    envelope, ///< envelope of one band, each site against its own floor, then vote and veto
    evidence  ///< weighted sum of envelopes of several bands and mixes against one floor
};
inline constexpr Choice<DetectionMethod> detection_methods[] = {{DetectionMethod::envelope, "envelope"},
                                                                {DetectionMethod::evidence, "evidence"}};

// The defaults of filter, envelope, floor and threshold were picked by `millpond tune` on three invented recordings of
// 15 min (typical scene, four sites and a reference, seeds 101 to 103): 96 % of the ripples found at 0.4 false per
// minute.
struct DetectorSettings {
    DetectionMethod method = DetectionMethod::evidence;
    FilterSettings filter;
    EnvelopeSettings envelope;
    FloorSettings floor;
    ThresholdSettings threshold;
    VoteSettings vote;
    VetoSettings veto;
    EvidenceSettings evidence;
    MainsRemovalSettings mains;
    StateGateSettings state_gate;
    double blanking_ms = 25.0;

    bool operator==(const DetectorSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, DetectorSettings& detector) {
    visit.choice(
        "method", detector.method, detection_methods,
        "what crosses the threshold: the envelope of one band (filter, envelope, vote, veto), or the evidence of "
        "several bands and site mixes (evidence)");
    visit.group("filter", detector.filter, "causal band-pass of the ripple band");
    visit.group("envelope", detector.envelope, "size of the band-passed signal");
    visit.group("floor", detector.floor, "what the envelope is without ripples");
    visit.group("threshold", detector.threshold, "when a site is above");
    visit.group("vote", detector.vote, "how sites decide together");
    visit.group("veto", detector.veto,
                "when the reference says that it is no ripple (needs a channel of role reference)");
    visit.group("evidence", detector.evidence, "weighted bands and site mixes (method: evidence)");
    visit.group("mains", detector.mains, "mains hum and its multiples inside the band");
    visit.group("state_gate", detector.state_gate, "a gate that follows the animal's state by the signal itself");
    visit.number("blanking_ms", detector.blanking_ms, {0.0, 1000.0},
                 "after a pulse's place in the stream the detector holds its state this long; must cover the loop's "
                 "latency, the pulse or train, and its artefact");
}

} // namespace millpond
