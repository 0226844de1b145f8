#include "synth/artefacts.hpp"

#include <algorithm>

namespace millpond {
namespace {

double steps_per_min(const ArtefactSettings& artefacts, StepReach reach) {
    return reach == StepReach::all_channels ? artefacts.steps_per_min : artefacts.site_steps_per_min;
}

RandomStream stream_of(StepReach reach) {
    return reach == StepReach::all_channels ? RandomStream::steps : RandomStream::site_steps;
}

} // namespace

Steps::Steps(const SceneSettings& settings, StepReach reach)
    : height_uv_(settings.artefacts.step_uv), reach_(reach),
      mean_wait_s_(60.0 / steps_per_min(settings.artefacts, reach)), rate_{settings.rate_hz},
      random_(settings.seed, number_of(stream_of(reach))),
      keep_(portable_exp(-1000.0 / (settings.artefacts.step_recovery_ms * settings.rate_hz))),
      next_s_(random_.exponential(mean_wait_s_)) {}

void Steps::add(SampleIndex at, std::span<double> frame) {
    levels_uv_.resize(frame.size(), 0.0);
    for (auto& level : levels_uv_) {
        level *= keep_;
    }
    while (next_s_ <= seconds_at(at, rate_)) {
        const double step_uv = random_.uniform() < 0.5 ? height_uv_ : -height_uv_;
        happenings_.push_back({next_s_, next_s_, HappeningKind::step});
        next_s_ += random_.exponential(mean_wait_s_);
        if (reach_ == StepReach::one_channel) {
            levels_uv_[static_cast<std::size_t>(random_.uniform() * static_cast<double>(frame.size()))] += step_uv;
        } else {
            for (auto& level : levels_uv_) {
                level += step_uv;
            }
        }
    }
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += levels_uv_[i];
    }
}

BandNoise::BandNoise(Random random, double low_hz, double high_hz, Hertz rate)
    : random_(random), low_keep_(portable_exp(-6.28318530717958647693 * low_hz / rate.value)),
      high_keep_(portable_exp(-6.28318530717958647693 * high_hz / rate.value)) {
    // Until exp(-37) of the energy of the slower pole is left.
    const auto memory = static_cast<std::uint64_t>(3.0 / std::min(low_hz, high_hz) * rate.value) + 16;
    double energy = 0.0;
    for (std::uint64_t i = 0; i < memory; ++i) {
        const double response = filtered(i == 0 ? 1.0 : 0.0);
        energy += response * response;
    }
    gain_ = 1.0 / std::sqrt(energy);
    last_ = high_passed_ = once_ = twice_ = 0.0;
}

double BandNoise::filtered(double white) noexcept {
    high_passed_ = low_keep_ * high_passed_ + white - last_;
    last_ = white;
    once_ = high_keep_ * once_ + high_passed_;
    twice_ = high_keep_ * twice_ + once_;
    return twice_;
}

Muscle::Muscle(const SceneSettings& settings, const std::vector<ChannelGains>& gains)
    : artefacts_(settings.artefacts), rate_{settings.rate_hz}, random_(settings.seed, number_of(RandomStream::muscle)),
      shared_(Random(settings.seed, number_of(RandomStream::muscle_own, gains.size())), artefacts_.muscle_low_hz,
              artefacts_.muscle_high_hz, rate_) {
    for (std::size_t i = 0; i < gains.size(); ++i) {
        own_.emplace_back(Random(settings.seed, number_of(RandomStream::muscle_own, i)), artefacts_.muscle_low_hz,
                          artefacts_.muscle_high_hz, rate_);
        shares_.push_back(gains[i].reference ? artefacts_.muscle_reference : 1.0);
    }
    draw_next(0.0);
}

void Muscle::draw_next(double not_before_s) {
    const double length_s = artefacts_.muscle_ms / 1000.0;
    const bool chews = begin_s_ > 0.0 && random_.uniform() < artefacts_.chewing_share;
    if (chews) {
        begin_s_ = std::max(not_before_s, begin_s_ + artefacts_.chewing_ms / 1000.0);
    } else {
        begin_s_ = not_before_s + random_.exponential(60.0 / artefacts_.muscle_per_min);
        size_uv_ = artefacts_.muscle_uv * portable_exp(artefacts_.muscle_log_sd * random_.normal_within(2.5));
    }
    happenings_.push_back({begin_s_, begin_s_ + length_s, HappeningKind::muscle});
}

void Muscle::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    const double length_s = artefacts_.muscle_ms / 1000.0;
    if (t >= begin_s_ + length_s) {
        draw_next(begin_s_ + length_s);
    }
    if (t < begin_s_) {
        return;
    }
    const double window = portable_sin_turns(0.5 * (t - begin_s_) / length_s);
    const double height_uv = size_uv_ * window * window;
    const double shared = std::sqrt(1.0 - artefacts_.muscle_own) * shared_.next();
    for (std::size_t i = 0; i < frame.size(); ++i) {
        const double own = artefacts_.muscle_own > 0.0 ? std::sqrt(artefacts_.muscle_own) * own_[i].next() : 0.0;
        frame[i] += shares_[i] * height_uv * (shared + own);
    }
}

} // namespace millpond
