// A scene to which a test adds the one element that it is about.
#pragma once

#include "synth/scene.hpp"

#include <algorithm>
#include <vector>

namespace millpond::test {

/// Ripples of one site and nothing else.
inline SceneSettings bare() {
    SceneSettings settings;
    settings.sites = 1;
    settings.background.rms_uv = settings.background.amplifier_uv = 0.0;
    settings.sharp_wave.amplitude_uv = 0.0;
    return settings;
}

/// Nothing at all on `sites` sites.
inline SceneSettings silent(int sites = 1, bool reference = false) {
    auto settings = bare();
    settings.sites = sites;
    settings.reference = reference;
    settings.ripples.rate_per_s = 0.0;
    return settings;
}

struct Lived {
    std::vector<float> frames;
    std::vector<RippleTruth> truth;
    std::vector<Happening> happenings; ///< with onsets within the recording

    [[nodiscard]] std::vector<Happening> of(HappeningKind kind) const {
        std::vector<Happening> some;
        std::copy_if(happenings.begin(), happenings.end(), std::back_inserter(some),
                     [kind](const auto& each) { return each.kind == kind; });
        return some;
    }
};

inline Lived live_through(const SceneSettings& settings) {
    auto scene = Scene::make(settings);
    Lived lived;
    lived.frames.resize(scene.frames() * scene.channels().size());
    scene.next(lived.frames);
    lived.truth = scene.truth();
    lived.happenings = scene.happenings();
    std::erase_if(lived.happenings, [&](const auto& each) { return each.onset_s >= settings.duration_s; });
    return lived;
}

} // namespace millpond::test
