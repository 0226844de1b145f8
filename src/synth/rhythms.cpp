#include "synth/rhythms.hpp"

namespace millpond {

Theta::Theta(const SceneSettings& settings, std::vector<ChannelGains> gains, std::shared_ptr<const States> states)
    : theta_(settings.theta), rate_{settings.rate_hz}, gains_(std::move(gains)), states_(std::move(states)),
      random_(settings.seed, number_of(RandomStream::theta)), keep_(portable_exp(-1.0 / settings.rate_hz)),
      wander_(random_.normal()), turns_(random_.uniform()) {}

void Theta::add(SampleIndex at, std::span<double> frame) {
    wander_ = keep_ * wander_ + std::sqrt(1.0 - keep_ * keep_) * random_.normal();
    turns_ += (theta_.frequency_hz + theta_.wander_hz * wander_) / rate_.value;
    turns_ -= std::floor(turns_);
    const double wave = theta_.amplitude_uv * states_->theta_at(seconds_at(at, rate_)) * portable_sin_turns(turns_);
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += gains_[i].theta * wave;
    }
}

Delta::Delta(const SceneSettings& settings, const std::vector<ChannelGains>& gains,
             std::shared_ptr<const States> states)
    : rate_{settings.rate_hz}, states_(std::move(states)), random_(settings.seed, number_of(RandomStream::delta)) {
    for (const auto& gain : gains) {
        sizes_uv_.push_back(settings.delta.rms_uv * (gain.reference ? settings.delta.reference_share : 1.0));
    }
    const double keep = portable_exp(-6.28318530717958647693 * settings.delta.width_hz / rate_.value);
    const double turns = settings.delta.frequency_hz / rate_.value;
    turn_ = {keep * portable_cos_turns(turns), keep * portable_sin_turns(turns)};
    // Until exp(-25) of the energy of its response to an impulse is left.
    const auto memory = static_cast<std::uint64_t>(2.0 / settings.delta.width_hz * rate_.value);
    double energy = 0.0;
    for (std::uint64_t i = 0; i < memory; ++i) {
        const double response = next(i == 0 ? 1.0 : 0.0);
        energy += response * response;
    }
    gain_ = 1.0 / std::sqrt(energy);
    first_ = second_ = {};
    for (std::uint64_t i = 0; i < memory; ++i) {
        next(random_.normal()); // stationary before the first frame
    }
}

Delta::Complex Delta::resonated(Complex state, Complex input) const noexcept {
    return {state.real * turn_.real - state.imaginary * turn_.imaginary + input.real,
            state.real * turn_.imaginary + state.imaginary * turn_.real + input.imaginary};
}

double Delta::next(double white) noexcept {
    first_ = resonated(first_, {white, 0.0});
    second_ = resonated(second_, first_);
    return gain_ * second_.real;
}

void Delta::add(SampleIndex at, std::span<double> frame) {
    const double wave = next(random_.normal()) * states_->delta_at(seconds_at(at, rate_));
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += sizes_uv_[i] * wave;
    }
}

Mains::Mains(const SceneSettings& settings)
    : mains_(settings.mains), rate_{settings.rate_hz},
      turns_(Random(settings.seed, number_of(RandomStream::mains)).uniform()),
      wander_(Random(settings.seed, number_of(RandomStream::mains_drift)), settings.mains.drift_s) {}

void Mains::add(SampleIndex at, std::span<double> frame) {
    turns_ += mains_.frequency_hz / rate_.value;
    turns_ -= std::floor(turns_);
    const auto harmonic = [this](double number, double share) { return share * portable_sin_turns(number * turns_); };
    const double shape = portable_sin_turns(turns_) + harmonic(3.0, mains_.third_harmonic) +
                         harmonic(5.0, mains_.fifth_harmonic) + harmonic(2.0, mains_.second_harmonic) +
                         harmonic(4.0, mains_.fourth_harmonic);
    const double size_uv = mains_.amplitude_uv * portable_exp(mains_.drift_log_sd * wander_.at(seconds_at(at, rate_)));
    for (auto& value : frame) {
        value += size_uv * shape;
    }
}

} // namespace millpond
