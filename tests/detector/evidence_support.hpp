// Settings of method evidence for tests: the defaults, and the same bands on a mix of sites that was learned from the
// quiet scene's own background. Thread: test.
#pragma once

#include "detector/detection_trial.hpp"
#include "synth/named_scenes.hpp"

#include <cmath>
#include <vector>

namespace millpond::test {

inline SceneSettings quiet_without_ripples(std::uint64_t seed, double seconds) {
    auto scene = named_scene(SceneName::quiet);
    scene.seed = seed;
    scene.duration_s = seconds;
    scene.ripples.rate_per_s = 0.0;
    return scene;
}

inline DetectorSettings default_evidence() {
    DetectorSettings settings;
    settings.method = DetectionMethod::evidence;
    return settings;
}

/// Covariance of the channels' differences from frame to frame, which the fast part of the signal rules; lower triangle
/// by rows.
inline std::vector<double> covariance_of(const std::vector<float>& data, std::size_t channels) {
    std::vector<double> covariance;
    const std::size_t frames = data.size() / channels;
    for (std::size_t a = 0; a < channels; ++a) {
        for (std::size_t b = 0; b <= a; ++b) {
            double sum = 0.0;
            for (std::size_t i = 1; i < frames; ++i) {
                const auto step = [&](std::size_t channel) {
                    return static_cast<double>(data[i * channels + channel]) -
                           static_cast<double>(data[(i - 1) * channels + channel]);
                };
                sum += step(a) * step(b);
            }
            covariance.push_back(sum / static_cast<double>(frames - 1));
        }
    }
    return covariance;
}

/// Four sites and a reference, as in the quiet scene.
inline DetectorSettings learned_evidence() {
    auto scene = Scene::make(quiet_without_ripples(99, 30.0));
    auto settings = default_evidence();
    settings.evidence.background = covariance_of(samples_of(scene), 5);
    // Ripples spread 100 um (SD of a Gaussian) about the middle of sites 80 um apart, and do not reach the reference.
    settings.evidence.mixes = {{"learned", {0.25, 0.25, 0.25, 0.25, 0.0}, {0.49, 0.92, 0.92, 0.49, 0.0}}};
    for (auto& feature : settings.evidence.features) {
        feature.mix = "learned";
    }
    return settings;
}

} // namespace millpond::test
