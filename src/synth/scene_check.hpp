// Do the settings of a scene go together? Thread: control.
#pragma once

#include "synth/scene_settings.hpp"

#include <string>

namespace millpond {

/// Throws Refusal for the first two that contradict each other, `where` naming the settings.
void check_scene(const SceneSettings& settings, const std::string& where);

} // namespace millpond
