#include "tuning/learning.hpp"

#include "base/refusal.hpp"
#include "tuning/mix_learning.hpp"
#include "tuning/weight_learning.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace millpond {
namespace {

constexpr double track_rate_hz = 1250.0; // envelopes change slowly: more of them teach nothing

// Ladder of thresholds, in deviations, that the background is measured at.
constexpr double first_threshold = 2.5;
constexpr double threshold_step = 1.08;
constexpr std::size_t thresholds = 28; // up to about 20 deviations
constexpr std::uint64_t fewest_false = 3;
constexpr double least_fall = 1.3; // of the rate from one point to the next that is kept

bool has_reference(const TuningRecording& recording) {
    return std::any_of(recording.channels.begin(), recording.channels.end(),
                       [](const auto& channel) { return channel.role == ChannelRole::reference; });
}

bool needs_mix(const FeatureSettings& feature) {
    return feature.mix == learned_mix;
}

FeatureTrack track_of(const TuningRecording& recording, const Intervals& training, const DetectorSettings& settings,
                      Hertz rate) {
    auto detector = Detector::make(settings, recording.channels, rate);
    FeatureTrack track;
    track.recording = &recording;
    track.training = training;
    track.stride = std::max<std::size_t>(static_cast<std::size_t>(rate.value / track_rate_hz), 1);
    const std::size_t features = detector.feature_count(), lanes = detector.envelope_stride();
    const std::size_t frames = recording.frames();
    track.values.assign((frames + track.stride - 1) / track.stride * features, std::numeric_limits<float>::quiet_NaN());
    const FrameBlock all{SampleIndex{0}, recording.channels.size(), recording.data};
    std::vector<double> envelopes;
    std::uint64_t settled_from = detector.filter_settle_frames();
    detector.gap(SampleIndex{0});
    for (std::size_t at = 0; at < frames;) {
        const auto block = all.part(at, std::min<std::size_t>(4096, frames - at));
        const std::size_t finite = detector.finite_frames(block);
        if (finite == 0) {
            ++at;
            detector.gap(SampleIndex{at});
            settled_from = at + detector.filter_settle_frames();
            continue;
        }
        envelopes.resize(finite * lanes);
        detector.envelopes(block.part(0, finite), envelopes);
        for (std::size_t i = (track.stride - at % track.stride) % track.stride; i < finite; i += track.stride) {
            for (std::size_t f = 0; f < features && at + i >= settled_from; ++f) {
                track.values[(at + i) / track.stride * features + f] = static_cast<float>(envelopes[i * lanes + f]);
            }
        }
        at += finite;
    }
    return track;
}

void set_threshold(DetectorSettings& detector, double deviations) {
    // A calibration of two points puts the threshold where it is wanted, whatever else it says.
    detector.evidence.false_per_minute = 1.0;
    detector.evidence.calibration = {{deviations, 1.0}, {deviations + 1.0, 0.5}};
}

std::vector<CalibrationPoint> calibrate(std::span<const TuningRecording> recordings, const DetectorSettings& detector,
                                        const SweepPlan& plan, const SweepWatch& watch) {
    std::vector<DetectorSettings> ladder(thresholds, detector);
    std::vector<std::size_t> all(thresholds);
    std::vector<double> deviations(thresholds);
    for (std::size_t i = 0; i < thresholds; ++i) {
        all[i] = i;
        deviations[i] = std::round(first_threshold * std::pow(threshold_step, static_cast<double>(i)) * 100.0) / 100.0;
        set_threshold(ladder[i], deviations[i]);
    }
    const auto results = confirm(recordings, ladder, all, plan, watch);
    std::vector<CalibrationPoint> points;
    for (std::size_t i = 0; i < thresholds; ++i) {
        if (!results[i] || results[i]->training.false_detections < fewest_false) {
            continue;
        }
        const double rate = results[i]->training.false_per_minute;
        if (points.empty() || rate * least_fall <= points.back().per_minute) {
            points.push_back({deviations[i], std::round(rate * 1000.0) / 1000.0});
        }
    }
    if (points.size() < 2) {
        throw Refusal("recordings", "too few false detections in the training parts to measure their rate",
                      "longer recordings");
    }
    return points;
}

} // namespace

std::vector<FeatureSettings> usual_features(std::string_view mix) {
    const std::string on(mix);
    std::vector<FeatureSettings> features{{on, 150.0, 240.0, 1, 10.0, 1.0},  {on, 175.0, 215.0, 1, 0.0, 1.0},
                                          {on, 320.0, 560.0, 2, 12.0, -1.0}, {on, 260.0, 400.0, 2, 12.0, -1.0},
                                          {on, 100.0, 140.0, 1, 12.0, -1.0}, {on, 60.0, 100.0, 1, 12.0, -1.0}};
    if (mix == sites_mix) {
        features.push_back({std::string(reference_mix), 150.0, 240.0, 1, 10.0, -1.0}); // a learned mix has it in itself
    }
    return features;
}

Learned learn_evidence(std::span<const TuningRecording> recordings, const DetectorSettings& base,
                       const LearningPlan& plan, const SweepWatch& watch) {
    const auto& sweep = plan.sweep;
    std::vector<Intervals> training;
    for (const auto& recording : recordings) {
        training.push_back(parts_of(recording.frames(), frames_in_ms(sweep.block_s * 1000.0, sweep.rate)).training);
    }
    Learned learned{base};
    auto& evidence = learned.detector.evidence;
    learned.detector.method = DetectionMethod::evidence;
    evidence.features = plan.features;
    if (!std::all_of(recordings.begin(), recordings.end(), has_reference)) {
        std::erase_if(evidence.features, [](const auto& feature) { return feature.mix == reference_mix; });
    }
    evidence.mixes.clear();
    evidence.background.clear();
    if (std::any_of(plan.features.begin(), plan.features.end(), needs_mix)) {
        const auto mix = learn_mix(recordings, training, sweep.rate, plan.shrinkage);
        evidence.mixes = {{std::string(learned_mix), mix.weights, mix.pattern}};
        evidence.background = mix.background;
        learned.mix_gain = mix.gain;
        learned.mean_gain = mix.mean_gain;
    }
    set_threshold(learned.detector, first_threshold);
    std::vector<FeatureTrack> tracks;
    for (std::size_t i = 0; i < recordings.size(); ++i) {
        tracks.push_back(track_of(recordings[i], training[i], learned.detector, sweep.rate));
    }
    const auto weights = learn_weights(tracks, evidence.features.size(), sweep.rate);
    tracks.clear();
    for (std::size_t i = 0; i < weights.size(); ++i) {
        evidence.features[i].weight = std::round(weights[i] * 1e4) / 1e4;
    }
    evidence.calibration = calibrate(recordings, learned.detector, sweep, watch);
    evidence.false_per_minute = plan.false_per_minute;
    return learned;
}

} // namespace millpond
