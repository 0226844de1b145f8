#include "synth/named_scenes.hpp"

namespace millpond {
namespace {

SceneSettings quiet() {
    SceneSettings scene;
    scene.reference = true;
    scene.duration_s = 600.0;
    scene.site_spacing_um = 80.0;
    scene.background.slope = 1.65; // some 15 uV rms at 150-250 Hz
    scene.background.shared = 0.92;
    scene.background.correlation_um = 1500.0; // 0.87 between neighbouring sites, 0.3 with the reference
    scene.ripples.spread_um = 100.0;
    scene.ripples.depth_sd_um = 30.0;
    scene.ripples.doublet_share = 0.15;
    return scene;
}

SceneSettings typical() {
    auto scene = quiet();
    scene.ripples.amplitude_log_sd = 0.4;
    scene.ripples.small_share = 0.25;
    scene.ripples.small_size = 0.4;
    scene.delta.rms_uv = 150.0;
    scene.gamma.rate_per_s = 0.3;
    scene.gamma.amplitude_uv = 60.0;
    scene.mains.amplitude_uv = 20.0;
    scene.mains.fourth_harmonic = 0.1;
    scene.mains.drift_log_sd = 0.3;
    scene.artefacts.muscle_per_min = 1.0;
    scene.artefacts.muscle_uv = 80.0;
    scene.artefacts.muscle_log_sd = 0.7;
    scene.artefacts.muscle_own = 0.1;
    scene.artefacts.muscle_reference = 1.5;
    scene.artefacts.chewing_share = 0.5;
    scene.artefacts.steps_per_min = 0.2;
    scene.artefacts.site_steps_per_min = 0.2;
    scene.artefacts.spikes_per_min = 2.0;
    scene.gain_drift.log_sd = 0.1;
    return scene;
}

SceneSettings hard() {
    auto scene = typical();
    scene.background.slope = 1.45; // some 22 uV rms at 150-250 Hz
    scene.ripples.small_share = 0.3;
    scene.states.rest_s = 40.0;
    scene.states.run_s = 15.0;
    scene.theta.amplitude_uv = 250.0;
    scene.spike_bursts.share_of_cycles = 0.3;
    scene.spike_bursts.amplitude_uv = 150.0;
    scene.spike_bursts.site = 2;
    scene.gamma.rate_per_s = 0.6;
    scene.gamma.amplitude_uv = 80.0;
    scene.mains.amplitude_uv = 40.0;
    scene.artefacts.muscle_per_min = 3.0;
    scene.artefacts.muscle_own = 0.2;
    scene.artefacts.muscle_reference = 1.2;
    scene.artefacts.steps_per_min = 0.5;
    scene.artefacts.site_steps_per_min = 0.5;
    scene.artefacts.spikes_per_min = 6.0;
    scene.gain_drift.log_sd = 0.2;
    return scene;
}

SceneSettings running() {
    SceneSettings scene;
    scene.sites = 1;
    scene.duration_s = 600.0;
    scene.background.slope = 1.4;
    scene.states.first = AnimalState::run;
    scene.states.rest_s = 0.0;
    scene.states.run_s = 60.0;
    scene.states.ripples_in_run = 1.0;
    scene.theta.amplitude_uv = 300.0;
    scene.spike_bursts.share_of_cycles = 0.7;
    scene.spike_bursts.amplitude_uv = 800.0; // at 1250 Hz some 0.5 of it is left
    scene.spike_bursts.amplitude_log_sd = 0.6;
    scene.spike_bursts.width_ms = 1.2;
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
