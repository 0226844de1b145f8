#include "proof/recordings.hpp"

#include "synth/scene.hpp"
#include "tuning/job_pool.hpp"

#include <algorithm>
#include <thread>

namespace millpond::bench {
namespace {

std::vector<float> frames_of(Scene& scene) {
    std::vector<float> frames(scene.frames() * scene.channels().size());
    scene.next(frames);
    return frames;
}

std::vector<float> frames_of(const SceneSettings& settings) {
    auto scene = Scene::make(settings);
    return frames_of(scene);
}

Ripples truth_of(const Scene& scene) {
    Ripples ripples;
    for (const auto& ripple : scene.truth()) {
        ripples.push_back({ripple.onset, ripple.peak, ripple.end, ripple.amplitude_uv});
    }
    return ripples;
}

} // namespace

ProofRecording invented(SceneSettings settings, Split parts) {
    auto scene = Scene::make(settings);
    ProofRecording recording{scene.channels(), scene.rate(), frames_of(scene), {}, {}, {}};
    recording.truth = truth_of(scene);
    if (parts == Split::in_parts) {
        // Every element has random numbers of its own and they add up, gain drift included: what differs without
        // ripples is the ripples.
        settings.sharp_wave.amplitude_uv = 0.0;
        recording.ripples = frames_of(settings);
        settings.ripples.rate_per_s = 0.0;
        recording.background = frames_of(settings);
        std::transform(recording.ripples.begin(), recording.ripples.end(), recording.background.begin(),
                       recording.ripples.begin(), std::minus<>());
    }
    return recording;
}

std::vector<ProofRecording> invented(SceneName name, std::uint64_t first_seed, std::size_t seeds, double duration_s,
                                     Split parts) {
    std::vector<ProofRecording> recordings(seeds);
    in_parallel(seeds, [&](std::size_t i) {
        auto settings = named_scene(name);
        settings.seed = first_seed + i;
        settings.duration_s = duration_s;
        recordings[i] = invented(settings, parts);
    });
    return recordings;
}

std::vector<TuningRecording> for_tuning(const std::vector<ProofRecording>& recordings) {
    std::vector<TuningRecording> all;
    std::transform(recordings.begin(), recordings.end(), std::back_inserter(all),
                   [](const auto& recording) { return recording.for_tuning(); });
    return all;
}

unsigned processors() noexcept {
    return std::max(1U, std::thread::hardware_concurrency());
}

void in_parallel(std::size_t count, const std::function<void(std::size_t)>& job) {
    const std::atomic<bool> never{false};
    run_jobs(count, processors(), never, job, [] {});
}

} // namespace millpond::bench
