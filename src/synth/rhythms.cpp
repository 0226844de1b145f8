#include "synth/rhythms.hpp"

namespace millpond {

Theta::Theta(const SceneSettings& settings, std::vector<ChannelGains> gains)
    : theta_(settings.theta), rate_hz_(settings.rate_hz), gains_(std::move(gains)),
      random_(settings.seed, number_of(RandomStream::theta)), keep_(portable_exp(-1.0 / settings.rate_hz)),
      wander_(random_.normal()), turns_(random_.uniform()) {}

void Theta::add(SampleIndex /*at*/, std::span<double> frame) {
    wander_ = keep_ * wander_ + std::sqrt(1.0 - keep_ * keep_) * random_.normal();
    turns_ += (theta_.frequency_hz + theta_.wander_hz * wander_) / rate_hz_;
    turns_ -= std::floor(turns_);
    const double wave = theta_.amplitude_uv * portable_sin_turns(turns_);
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += gains_[i].theta * wave;
    }
}

Mains::Mains(const SceneSettings& settings)
    : mains_(settings.mains), turns_each_frame_(settings.mains.frequency_hz / settings.rate_hz),
      turns_(Random(settings.seed, number_of(RandomStream::mains)).uniform()) {}

void Mains::add(SampleIndex /*at*/, std::span<double> frame) {
    turns_ += turns_each_frame_;
    turns_ -= std::floor(turns_);
    const double wave =
        mains_.amplitude_uv * (portable_sin_turns(turns_) + mains_.third_harmonic * portable_sin_turns(3.0 * turns_) +
                               mains_.fifth_harmonic * portable_sin_turns(5.0 * turns_));
    for (auto& value : frame) {
        value += wave;
    }
}

} // namespace millpond
