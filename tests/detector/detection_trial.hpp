// A detector over an invented scene, scored against its truth. Thread: test.
#pragma once

#include "detector/detector.hpp"
#include "synth/scene.hpp"

#include <algorithm>
#include <vector>

namespace millpond::test {

struct Trial {
    std::size_t ripples = 0, hits = 0, falses = 0;
    std::vector<double> latencies_ms; ///< ascending
    std::vector<double> places_s;     ///< of detections that the detector did not refuse itself
    std::vector<SiteChange> sites;

    [[nodiscard]] double hit_rate() const { return static_cast<double>(hits) / static_cast<double>(ripples); }
    [[nodiscard]] double median_ms() const { return latencies_ms.at(latencies_ms.size() / 2); }
};

inline std::vector<float> samples_of(Scene& scene) {
    std::vector<float> data(scene.frames() * scene.channels().size());
    scene.next(data);
    return data;
}

/// Scores what happens from `from_s` on.
inline Trial try_detector(const SceneSettings& settings, const DetectorSettings& detector_settings, double from_s) {
    auto scene = Scene::make(settings);
    const auto data = samples_of(scene);
    auto detector = Detector::make(detector_settings, scene.channels(), scene.rate());
    detector.gap(SampleIndex{0});
    Trial trial;
    for (FrameBlock rest{SampleIndex{0}, scene.channels().size(), data}; rest.frames() > 0;) {
        std::optional<Crossing> crossing;
        const auto used = detector.run(rest, crossing);
        if (crossing && !crossing->settling && !crossing->unsettled && !crossing->vetoed) {
            trial.places_s.push_back(seconds_at(crossing->at, scene.rate()));
        }
        while (const auto change = detector.site_change()) {
            trial.sites.push_back(*change);
        }
        rest = rest.part(used, rest.frames() - used);
    }
    std::vector<bool> belongs(trial.places_s.size());
    for (const auto& ripple : scene.truth()) {
        const double onset = seconds_at(ripple.onset, scene.rate()), end = seconds_at(ripple.end, scene.rate());
        if (onset < from_s) {
            continue;
        }
        ++trial.ripples;
        bool hit = false;
        for (std::size_t i = 0; i < belongs.size(); ++i) {
            if (trial.places_s[i] >= onset && trial.places_s[i] <= end) {
                belongs[i] = true;
                if (!hit) {
                    trial.latencies_ms.push_back(1000.0 * (trial.places_s[i] - onset));
                }
                hit = true;
            }
        }
        trial.hits += hit ? 1 : 0;
    }
    for (std::size_t i = 0; i < belongs.size(); ++i) {
        trial.falses += !belongs[i] && trial.places_s[i] >= from_s ? 1 : 0;
    }
    std::sort(trial.latencies_ms.begin(), trial.latencies_ms.end());
    return trial;
}

} // namespace millpond::test
