// Why the floor is clipped: how far ripples push its mean and deviation, by clip level, on an invented scene with and
// without its ripples. A clip of 1000 deviations is no clip. Usage: floor_bench
#include "detector/detector.hpp"
#include "support/bench.hpp"
#include "synth/scene.hpp"

#include <cstdio>

namespace {

using namespace millpond;

std::vector<float> scene_of(double ripples_per_s) {
    SceneSettings settings;
    settings.duration_s = 600.0;
    settings.rate_hz = 1250.0;
    settings.sites = 4;
    settings.reference = false;
    settings.ripples.rate_per_s = ripples_per_s;
    settings.seed = 77;
    auto scene = Scene::make(settings);
    std::vector<float> data(static_cast<std::size_t>(settings.duration_s * settings.rate_hz) * 4);
    scene.next(data);
    return data;
}

FloorDetail floor_after(const std::vector<float>& data, double clip) {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.floor.clip_deviations = clip;
    settings.floor.freeze_ms = 0.0; // the clip alone
    settings.threshold.deviations = 100.0;
    settings.threshold.rearm_deviations = 100.0;
    auto detector = Detector::make(settings, ripple_channels(4), Hertz{1250.0});
    std::optional<Crossing> crossing;
    detector.run({SampleIndex{0}, 4, data}, crossing);
    return detector.floor(detector.floor_count() - 1);
}

} // namespace

int main() {
    const auto without = scene_of(0.0);
    std::printf("floor of the mean over 4 sites after 600 s at 1250 Hz, with ripples over without\n");
    std::printf("%12s %10s %22s %22s\n", "ripples a s", "clip", "mean", "deviation");
    for (const double rate : {0.5, 1.0, 2.0}) {
        const auto with_ripples = scene_of(rate);
        for (const double clip : {2.0, 3.0, 4.0, 6.0, 1000.0}) {
            const auto plain = floor_after(without, clip), pushed = floor_after(with_ripples, clip);
            const auto unclipped = floor_after(without, 1000.0);
            std::printf("%12g %10g %10.3f (bias %5.3f) %9.3f (bias %5.3f)\n", rate, clip, pushed.mean / plain.mean,
                        plain.mean / unclipped.mean, pushed.deviation / plain.deviation,
                        plain.deviation / unclipped.deviation);
        }
    }
}
