#include "synth/background.hpp"

#include <algorithm>

namespace millpond {
namespace {

/// Until exp(-37) of the slowest pole's energy is left, which falls by exp(-4 pi corner t).
std::uint64_t memory_frames(double corner_hz, Hertz rate) {
    return static_cast<std::uint64_t>(3.0 / corner_hz * rate.value);
}

} // namespace

SlopeFilter::SlopeFilter(double slope, double corner_hz, Hertz rate) {
    const auto root = [rate](double hz) { return portable_exp(-6.28318530717958647693 * hz / rate.value); };
    const double zero_over_pole = portable_exp(0.5 * slope * 0.693147180559945309417);
    for (double pole_hz = corner_hz; pole_hz < 0.4 * rate.value; pole_hz *= 2.0) {
        sections_.push_back({root(pole_hz * zero_over_pole), root(pole_hz)});
    }
    held_.assign(sections_.size() + 1, 0.0);
    double energy = 0.0;
    for (std::uint64_t i = 0; i < memory_frames(corner_hz, rate); ++i) {
        const double response = filtered(i == 0 ? 1.0 : 0.0);
        energy += response * response;
    }
    gain_ = 1.0 / std::sqrt(energy);
    held_.assign(sections_.size() + 1, 0.0);
}

double SlopeFilter::filtered(double white) noexcept {
    double value = white;
    for (std::size_t i = 0; i < sections_.size(); ++i) {
        // held_[i + 1] is this section's last output: the next one's last input.
        const double out = value - sections_[i].zero * held_[i] + sections_[i].pole * held_[i + 1];
        held_[i] = value;
        value = out;
    }
    held_.back() = value;
    return value;
}

double SlopeFilter::next(double white) noexcept {
    return gain_ * filtered(white);
}

Background::Background(const SceneSettings& settings, const std::vector<ChannelGains>& gains)
    : shared_uv_(settings.background.rms_uv * std::sqrt(settings.background.shared)),
      own_uv_(settings.background.rms_uv * std::sqrt(1.0 - settings.background.shared)),
      amplifier_uv_(settings.background.amplifier_uv),
      shared_{Random(settings.seed, number_of(RandomStream::background_shared)),
              SlopeFilter(settings.background.slope, settings.background.corner_hz, Hertz{settings.rate_hz})} {
    const double reach_um = settings.background.correlation_um;
    shared_now_.assign(gains.size(), 0.0);
    for (std::size_t i = 0; i < gains.size(); ++i) {
        if (reach_um > 0.0) {
            near_.push_back({Random(settings.seed, number_of(RandomStream::background_near, i)), shared_.filter});
            // The reference, last in the list, lies beyond the first site.
            neighbour_.push_back(gains[i].reference || i == 0 ? 0 : i - 1);
            const double distance_um = std::abs(gains[i].below_um - gains[neighbour_[i]].below_um);
            correlation_.push_back(i == 0 ? 0.0 : portable_exp(-distance_um / reach_um));
        }
        own_.push_back({Random(settings.seed, number_of(RandomStream::background_own, i)), shared_.filter});
        amplifier_.emplace_back(settings.seed, number_of(RandomStream::amplifier, i));
    }
    // Slow noise needs time to become stationary: that time passes before the first frame.
    for (std::uint64_t i = 0; i < memory_frames(settings.background.corner_hz, Hertz{settings.rate_hz}); ++i) {
        share();
        for (auto& own : own_) {
            own.next();
        }
    }
}

void Background::share() {
    if (near_.empty()) {
        std::fill(shared_now_.begin(), shared_now_.end(), shared_.next());
        return;
    }
    for (std::size_t i = 0; i < near_.size(); ++i) {
        const double kept = correlation_[i];
        shared_now_[i] = kept * shared_now_[neighbour_[i]] + std::sqrt(1.0 - kept * kept) * near_[i].next();
    }
}

void Background::add(SampleIndex /*at*/, std::span<double> frame) {
    share();
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += shared_uv_ * shared_now_[i] + own_uv_ * own_[i].next() + amplifier_uv_ * amplifier_[i].normal();
    }
}

} // namespace millpond
