// Learns the evidence detector from recordings: a mix of sites, the weights of features, and the threshold for a false
// rate. Thread: cold; the calls use several. Memory: that of the recordings, and features x 4 bytes for about 1250
// frames of each second.
//
//   mix          direction in which ripples stand out most from the background: the leading generalised eigenvector of
//                the covariance inside ripples against that outside, in the ripple band, shrunk towards equal and
//                independent channels (Cohen 2022, NeuroImage, tutorial; from memory)
//   weights      logistic regression of ripples against the background that looks most like ripples, found anew with
//                each round's weights (hard examples; common practice)
//   calibration  the whole engine over the training parts at a ladder of thresholds
//
// Only the training parts of sweep.hpp are looked at; held-out parts are for the figures.
#pragma once

#include "tuning/sweep.hpp"

#include <vector>

namespace millpond {

struct LearningPlan {
    SweepPlan sweep;
    std::vector<FeatureSettings> features; ///< mixes named `learned_mix` need learning; weights are found
    double shrinkage = 0.01;               ///< of the background's covariance
    double false_per_minute = 1.0;
};

/// Name of the mix that is learned.
inline constexpr std::string_view learned_mix = "ripple";

/// Features that did best on invented recordings: ripple band twice (broad and smooth, narrow and quick), the bands
/// above and below it against it. On the mix of that name; on the plain mean of sites the reference counts against it
/// too, where all recordings have one.
[[nodiscard]] std::vector<FeatureSettings> usual_features(std::string_view mix);

struct Learned {
    DetectorSettings detector; ///< `base` with method evidence, mix, weights, calibration
    double mix_gain = 0.0;     ///< power inside ripples against outside, in the mix; 0 where none was learned
    double mean_gain = 0.0;    ///< the same of the plain mean over sites
};

/// Refuses recordings without ripples in their training parts, and, where a mix is learned, of different channels.
[[nodiscard]] Learned learn_evidence(std::span<const TuningRecording> recordings, const DetectorSettings& base,
                                     const LearningPlan& plan, const SweepWatch& watch = {});

} // namespace millpond
