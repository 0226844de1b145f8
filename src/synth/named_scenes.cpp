#include "synth/named_scenes.hpp"

namespace millpond {
namespace {

SceneSettings quiet() {
    SceneSettings scene;
    scene.reference = true;
    scene.duration_s = 600.0;
    scene.background.correlation_um = 500.0;
    scene.ripples.doublet_share = 0.15;
    return scene;
}

SceneSettings typical() {
    auto scene = quiet();
    scene.background.slope = 1.2;
    scene.ripples.amplitude_log_sd = 0.45;
    scene.ripples.small_share = 0.1;
    scene.ripples.depth_sd_um = 30.0;
    scene.delta.rms_uv = 150.0;
    scene.gamma.rate_per_s = 0.5;
    scene.mains.amplitude_uv = 20.0;
    scene.mains.fourth_harmonic = 0.1;
    scene.mains.drift_log_sd = 0.3;
    scene.artefacts.muscle_per_min = 1.0;
    scene.artefacts.muscle_uv = 100.0;
    scene.artefacts.muscle_log_sd = 0.7;
    scene.artefacts.muscle_own = 0.1;
    scene.artefacts.muscle_reference = 1.5;
    scene.artefacts.chewing_share = 0.5;
    scene.artefacts.steps_per_min = 0.5;
    scene.artefacts.site_steps_per_min = 0.2;
    scene.artefacts.spikes_per_min = 2.0;
    scene.gain_drift.log_sd = 0.1;
    return scene;
}

SceneSettings hard() {
    auto scene = typical();
    scene.background.slope = 1.1;
    return scene;
}

SceneSettings running() {
    SceneSettings scene;
    scene.sites = 1;
    scene.duration_s = 600.0;
    scene.states.first = AnimalState::run;
    scene.states.rest_s = 0.0;
    scene.states.run_s = 60.0;
    scene.states.ripples_in_run = 1.0;
    scene.theta.amplitude_uv = 300.0;
    scene.spike_bursts.share_of_cycles = 0.5;
    scene.spike_bursts.amplitude_uv = 600.0;
    return scene;
}

} // namespace

SceneSettings named_scene(SceneName name) {
    switch (name) {
    case SceneName::quiet:
        return quiet();
    case SceneName::typical:
        return typical();
    case SceneName::hard:
        return hard();
    case SceneName::running:
        break;
    }
    return running();
}

} // namespace millpond
