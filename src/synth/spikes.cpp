#include "synth/spikes.hpp"

#include <algorithm>

namespace millpond {

double SpikeTrain::seen_deviation_s(double width_ms) const noexcept {
    const double own = own_deviation_s(width_ms), amplifier = 0.45 / rate_.value;
    return std::sqrt(own * own + amplifier * amplifier);
}

double SpikeTrain::value(const Spike& spike, double since_s) const noexcept {
    // A bell of deviation s smoothed by one of deviation a is one of deviation sqrt(s^2 + a^2), s over that as high.
    const double own = own_deviation_s(spike.width_ms), seen = seen_deviation_s(spike.width_ms);
    const double x = since_s / seen, height = own * own / (seen * seen);
    return spike.amplitude_uv * height * x * portable_exp(0.5 - 0.5 * x * x);
}

SpikeBursts::SpikeBursts(const SceneSettings& settings, const std::vector<ChannelGains>& gains,
                         std::shared_ptr<const States> states, const Theta* theta)
    : bursts_(settings.spike_bursts), theta_hz_(settings.theta.frequency_hz), rate_{settings.rate_hz},
      states_(std::move(states)), theta_(theta), random_(settings.seed, number_of(RandomStream::spike_bursts)),
      train_(rate_) {
    const double cell_um = gains[static_cast<std::size_t>(bursts_.site - 1)].below_um;
    for (const auto& gain : gains) {
        const double distance_um = std::abs(gain.below_um - cell_um);
        shares_.push_back(gain.reference ? 0.0 : portable_exp(-distance_um / bursts_.spread_um));
    }
}

void SpikeBursts::begin(double at_s) {
    // Always the same draws, so that one burst more or less moves no other.
    const double size = portable_exp(bursts_.amplitude_log_sd * random_.normal_within(2.5));
    const int spread = bursts_.most_spikes - bursts_.least_spikes + 1;
    const int spikes = bursts_.least_spikes + static_cast<int>(random_.uniform() * spread);
    double amplitude_uv = bursts_.amplitude_uv * size;
    const double begin_s = at_s;
    for (int i = 0; i < spikes; ++i) {
        train_.begin({at_s, amplitude_uv, bursts_.width_ms, 0});
        amplitude_uv *= 1.0 - bursts_.decline;
        const double range_ms = bursts_.most_interval_ms - bursts_.least_interval_ms;
        at_s += i + 1 < spikes ? (bursts_.least_interval_ms + range_ms * random_.uniform()) / 1000.0 : 0.0;
    }
    const double half_s = bursts_.width_ms / 2000.0;
    happenings_.push_back({begin_s - half_s, at_s + half_s, HappeningKind::spikes});
}

void SpikeBursts::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    const bool new_cycle = theta_->turns() < turns_before_;
    turns_before_ = theta_->turns();
    if (new_cycle) {
        const bool wanted = random_.uniform() < bursts_.share_of_cycles;
        const double phase = bursts_.phase_turns + bursts_.phase_sd_turns * random_.normal_within(2.0);
        const double at_s = t + phase / theta_hz_;
        if (wanted && (!states_->change() || states_->runs_at(at_s))) {
            begin(at_s);
        }
    }
    train_.at(t, [&](const auto&, double uv) {
        for (std::size_t i = 0; i < frame.size(); ++i) {
            frame[i] += shares_[i] * uv;
        }
    });
}

SingleSpikes::SingleSpikes(const SceneSettings& settings, std::size_t channels)
    : artefacts_(settings.artefacts), channels_(channels), rate_{settings.rate_hz},
      random_(settings.seed, number_of(RandomStream::single_spikes)), train_(rate_),
      next_s_(random_.exponential(60.0 / artefacts_.spikes_per_min)) {}

void SingleSpikes::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    const double early_s = train_.reach_s(artefacts_.spike_most_ms);
    while (next_s_ <= t + early_s) {
        const double range_ms = artefacts_.spike_most_ms - artefacts_.spike_least_ms;
        const double width_ms = artefacts_.spike_least_ms + range_ms * random_.uniform();
        const double sign = random_.uniform() < 0.5 ? 1.0 : -1.0;
        const auto channel = static_cast<std::size_t>(random_.uniform() * static_cast<double>(channels_));
        train_.begin({next_s_, sign * artefacts_.spike_uv, width_ms, channel});
        happenings_.push_back(
            {std::max(0.0, next_s_ - width_ms / 2000.0), next_s_ + width_ms / 2000.0, HappeningKind::spike});
        next_s_ += random_.exponential(60.0 / artefacts_.spikes_per_min);
    }
    train_.at(t, [&](const auto& spike, double uv) { frame[spike.channel] += uv; });
}

} // namespace millpond
