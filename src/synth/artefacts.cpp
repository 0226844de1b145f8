#include "synth/artefacts.hpp"

namespace millpond {

Steps::Steps(const SceneSettings& settings)
    : height_uv_(settings.artefacts.step_uv),
      mean_wait_s_(60.0 / settings.artefacts.steps_per_min), rate_{settings.rate_hz},
      random_(settings.seed, number_of(RandomStream::steps)),
      keep_(portable_exp(-1000.0 / (settings.artefacts.step_recovery_ms * settings.rate_hz))),
      next_s_(random_.exponential(mean_wait_s_)) {}

void Steps::add(SampleIndex at, std::span<double> frame) {
    level_uv_ *= keep_;
    while (next_s_ <= seconds_at(at, rate_)) {
        level_uv_ += random_.uniform() < 0.5 ? height_uv_ : -height_uv_;
        next_s_ += random_.exponential(mean_wait_s_);
    }
    for (auto& value : frame) {
        value += level_uv_;
    }
}

Muscle::Muscle(const SceneSettings& settings)
    : rms_uv_(settings.artefacts.muscle_uv), length_s_(settings.artefacts.muscle_ms / 1000.0),
      mean_wait_s_(60.0 / settings.artefacts.muscle_per_min), rate_{settings.rate_hz},
      random_(settings.seed, number_of(RandomStream::muscle)), begin_s_(random_.exponential(mean_wait_s_)) {}

void Muscle::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    if (t >= begin_s_ + length_s_) {
        begin_s_ = t + random_.exponential(mean_wait_s_);
    }
    if (t < begin_s_) {
        return;
    }
    const double window = portable_sin_turns(0.5 * (t - begin_s_) / length_s_);
    const double white = random_.normal();
    const double fast = (white - last_) / std::sqrt(2.0); // variance 1
    last_ = white;
    for (auto& value : frame) {
        value += rms_uv_ * window * window * fast;
    }
}

} // namespace millpond
