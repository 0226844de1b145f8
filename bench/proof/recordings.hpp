// What the proof bench measures on: invented scenes, whole and taken apart. Thread: cold.
#pragma once

#include "synth/named_scenes.hpp"
#include "tuning/joined_score.hpp"

#include <functional>
#include <vector>

namespace millpond::bench {

/// A recording whose ripples are known to the sample. Frames as in base/frames.hpp, microvolts.
struct ProofRecording {
    Channels channels;
    Hertz rate;
    std::vector<float> data;
    Ripples truth;
    std::vector<float> background; ///< the same without ripples; empty where nobody needs it
    std::vector<float> ripples;    ///< the ripples alone, without their sharp waves; likewise

    [[nodiscard]] std::uint64_t frames() const noexcept { return data.size() / channels.size(); }
    [[nodiscard]] TuningRecording for_tuning() const { return {channels, data, truth}; }
};

enum class Split : std::uint8_t {
    whole,   ///< data and truth
    in_parts ///< background and ripples as well
};

[[nodiscard]] ProofRecording invented(SceneSettings settings, Split parts);

/// One for each of the seeds `first`, `first` + 1, ...; `duration_s` in place of the scene's own.
[[nodiscard]] std::vector<ProofRecording> invented(SceneName scene, std::uint64_t first_seed, std::size_t seeds,
                                                   double duration_s, Split parts);

[[nodiscard]] std::vector<TuningRecording> for_tuning(const std::vector<ProofRecording>& recordings);

/// `job(i)` for every i below `count`, on as many threads as there are processors.
void in_parallel(std::size_t count, const std::function<void(std::size_t)>& job);
[[nodiscard]] unsigned processors() noexcept;

} // namespace millpond::bench
