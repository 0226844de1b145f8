// Scenes with a name, for measuring detectors: the same for everyone who names them. Thread: control.
#pragma once

#include "synth/scene_settings.hpp"

namespace millpond {

/// Parameters are invented unless scene_settings.hpp names a source. The textbook chain is a causal Butterworth
/// band-pass, rectified, smoothed, in deviations above its running mean, with a veto by the reference, at its best
/// settings for at most one false detection a minute.
enum class SceneName : unsigned char {
    quiet,   ///< four sites and a reference at rest, no artefacts: the textbook chain finds nearly all
    typical, ///< with small ripples, gamma, delta, muscle, steps, spikes and hum: it finds four of five
    hard,    ///< more of all that, in a louder background, and running in between: it finds about half
    running, ///< one site, no reference, theta with bursts of large spikes and ripples among them: it finds next to
             ///< none
};

inline constexpr Choice<SceneName> scene_names[] = {{SceneName::quiet, "quiet"},
                                                    {SceneName::typical, "typical"},
                                                    {SceneName::hard, "hard"},
                                                    {SceneName::running, "running"}};

[[nodiscard]] SceneSettings named_scene(SceneName name);

} // namespace millpond
