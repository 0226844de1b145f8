// What the evidence detector looks at and how much each part counts. Thread: control.
//
// Evidence is a weighted sum of envelopes: each feature is the envelope of one band of one mix of sites. Weights above
// 0 speak for a ripple, weights below 0 against it: what rises above, below or beside the ripple band as well is most
// likely a spike, a muscle or a step. `millpond tune --learn` finds mixes and weights from recordings; the defaults
// were found on invented ones and need no learned mix.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>
#include <vector>

namespace millpond {

/// One weighted sum of channels. Its weights are in the stream's order over channels of role ripple or reference.
struct MixSettings {
    std::string name;
    std::vector<double> weights;
    std::vector<double>
        pattern; ///< how what the mix extracts looks on each channel; empty: no new weights after a loss

    bool operator==(const MixSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, MixSettings& mix) {
    visit.text("name", mix.name, "what features call it");
    visit.numbers("weights", mix.weights, {-1e9, 1e9}, "one for each channel of role ripple or reference, in order");
    visit.numbers(
        "pattern", mix.pattern, {-1e12, 1e12},
        "how the mix's source looks on each channel (uV); lets the weights be solved anew without a lost site");
}

/// Mixes that are always there: the mean over ripple sites, and that over references.
inline constexpr std::string_view sites_mix = "sites";
inline constexpr std::string_view reference_mix = "reference";

struct FeatureSettings {
    std::string mix = std::string(sites_mix);
    double low_hz = 150.0;
    double high_hz = 250.0;
    int order = 1;
    double smoothing_ms = 10.0;
    double weight = 1.0;

    bool operator==(const FeatureSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, FeatureSettings& feature) {
    visit.text("mix", feature.mix,
               "a name from `mixes`, or sites (mean over ripple sites), or reference (mean over them)");
    visit.number("low_hz", feature.low_hz, {1.0, 20000.0}, "lower edge of its band (butterworth, -3 dB)");
    visit.number("high_hz", feature.high_hz, {2.0, 24000.0},
                 "upper edge; lowered to 0.45 of the rate where it lies above");
    visit.whole("order", feature.order, {1, 4}, "order of its band-pass, as filter.order");
    visit.number("smoothing_ms", feature.smoothing_ms, {0.0, 1000.0},
                 "delay of its smoother, as envelope.smoothing_ms");
    visit.number("weight", feature.weight, {-1e9, 1e9}, "what its envelope adds to the evidence");
}

/// One point of the measured background: so many crossings a minute at this threshold.
struct CalibrationPoint {
    double deviations = 0.0;
    double per_minute = 0.0;

    bool operator==(const CalibrationPoint&) const = default;
};

template <class Visitor> void describe(Visitor& visit, CalibrationPoint& point) {
    visit.number("deviations", point.deviations, {0.01, 1000.0}, "threshold, in deviations above the floor");
    visit.number("per_minute", point.per_minute, {1e-6, 1e6}, "crossings a minute outside ripples there");
}

struct TrainingSettings {
    std::string recording;
    std::string checksum;
    double minutes = 0.0;
    int ripples = 0;

    bool operator==(const TrainingSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, TrainingSettings& training) {
    visit.text("recording", training.recording, "file that the weights were learned from");
    visit.text("checksum", training.checksum, "CRC-32C of its samples as float32 microvolts");
    visit.number("minutes", training.minutes, {0.0, 1e9}, "how much of it was used");
    visit.whole("ripples", training.ripples, {0, 1e9}, "ripples in that part");
}

struct SiteWatchSettings {
    bool on = true;
    double huge_times = 20.0;
    double back_after_s = 10.0;

    bool operator==(const SiteWatchSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SiteWatchSettings& watch) {
    visit.flag("on", watch.on, "a site that is flat or huge for a second is left out of every mix");
    visit.number("huge_times", watch.huge_times, {2.0, 1e6},
                 "huge: moves this many times as fast as it used to, while the other sites do not");
    visit.number("back_after_s", watch.back_after_s, {1.0, 3600.0},
                 "a site that is well again for this long comes back");
}

// Learned with `tune --learn --plain-mean` on an hour and a half of invented recordings: scenes typical (seeds 201,
// 202) and hard (201), 30 min each; README has the figures on others. Without a reference its feature is left out.
inline std::vector<FeatureSettings> default_features() {
    return {{"sites", 150.0, 240.0, 1, 10.0, 1.0000},     {"sites", 175.0, 215.0, 1, 0.0, 0.0330},
            {"sites", 320.0, 560.0, 2, 12.0, -0.6646},    {"sites", 260.0, 400.0, 2, 12.0, -0.2873},
            {"sites", 100.0, 140.0, 1, 12.0, -0.3326},    {"sites", 60.0, 100.0, 1, 12.0, -0.1403},
            {"reference", 150.0, 240.0, 1, 10.0, -0.2769}};
}

inline std::vector<CalibrationPoint> default_calibration() {
    return {{2.50, 131.38}, {2.70, 84.07}, {2.92, 52.09}, {3.15, 28.96}, {3.40, 16.24}, {3.67, 8.12},
            {3.97, 4.20},   {4.28, 1.68},  {4.63, 0.59},  {5.00, 0.18},  {5.40, 0.07}};
}

struct EvidenceSettings {
    double false_per_minute = 1.0;
    std::vector<FeatureSettings> features = default_features();
    std::vector<CalibrationPoint> calibration = default_calibration();
    std::vector<MixSettings> mixes;
    std::vector<double> background;
    std::vector<TrainingSettings> trained_on;
    SiteWatchSettings site_watch;

    bool operator==(const EvidenceSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, EvidenceSettings& evidence) {
    visit.number("false_per_minute", evidence.false_per_minute, {0.001, 1000.0},
                 "crossings outside ripples that are asked for; sets the threshold by `calibration`");
    visit.list("features", evidence.features, "what the evidence is the weighted sum of");
    visit.list("calibration", evidence.calibration,
               "threshold against false per minute, as measured; at least two points");
    visit.list("mixes", evidence.mixes, "learned mixes of sites");
    visit.numbers("background", evidence.background, {-1e12, 1e12},
                  "covariance of the channels in the ripple band outside ripples (uV^2), lower triangle by rows");
    visit.list("trained_on", evidence.trained_on, "recordings that weights and mixes were learned from");
    visit.group("site_watch", evidence.site_watch, "what happens when a site dies");
}

} // namespace millpond
