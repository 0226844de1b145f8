// A whole invented scene at once.
#pragma once

#include "synth/scene.hpp"

#include <vector>

namespace millpond::test {

inline std::vector<float> all_frames(Scene scene) {
    std::vector<float> frames(scene.frames() * scene.channels().size());
    scene.next(frames);
    return frames;
}

} // namespace millpond::test
