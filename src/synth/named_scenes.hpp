// Scenes with a name, for measuring detectors: the same for everyone who names them. Thread: control.
#pragma once

#include "synth/scene_settings.hpp"

namespace millpond {

/// What makes a scene hard is in the comments of named_scenes.cpp. Parameters are invented unless the settings say
/// more.
enum class SceneName : unsigned char {
    quiet,   ///< four sites and a reference at rest, large ripples, no artefacts: any detector should do
    typical, ///< the same with all that a usual recording has: small ripples, doublets, gamma, muscle, hum, running
    hard,    ///< the same, worse: smaller ripples, more of everything else, a site that fails
    running, ///< one site without reference in theta, with bursts of large spikes, and ripples among them
};

inline constexpr Choice<SceneName> scene_names[] = {{SceneName::quiet, "quiet"},
                                                    {SceneName::typical, "typical"},
                                                    {SceneName::hard, "hard"},
                                                    {SceneName::running, "running"}};

[[nodiscard]] SceneSettings named_scene(SceneName name);

} // namespace millpond
