#include "synth/gamma.hpp"

namespace millpond {

Gamma::Gamma(const SceneSettings& settings, const std::vector<ChannelGains>& gains)
    : gamma_(settings.gamma), rate_{settings.rate_hz}, random_(settings.seed, number_of(RandomStream::gamma)) {
    for (const auto& gain : gains) {
        const double spread = (gain.below_um - gamma_.depth_um) / gamma_.spread_um;
        shares_.push_back(gain.reference ? gamma_.reference_share : portable_exp(-0.5 * spread * spread));
    }
    draw_next(0.0);
}

void Gamma::draw_next(double not_before_s) {
    const auto log_normal = [this](double median, double log_sd) {
        return median * portable_exp(log_sd * random_.normal_within(2.5));
    };
    burst_.begin_s = not_before_s + random_.exponential(1.0 / gamma_.rate_per_s);
    burst_.length_s = log_normal(gamma_.duration_ms, gamma_.duration_log_sd) / 1000.0;
    burst_.amplitude_uv = log_normal(gamma_.amplitude_uv, gamma_.amplitude_log_sd);
    burst_.hz = gamma_.low_hz + (gamma_.high_hz - gamma_.low_hz) * random_.uniform();
    burst_.phase_turns = random_.uniform();
    logged_ = false;
}

void Gamma::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    if (t >= burst_.begin_s + burst_.length_s) {
        draw_next(burst_.begin_s + burst_.length_s);
    }
    const double since_s = t - burst_.begin_s;
    if (since_s < 0.0 || since_s >= burst_.length_s) {
        return;
    }
    if (!logged_) {
        happenings_.push_back({burst_.begin_s, burst_.begin_s + burst_.length_s, HappeningKind::gamma});
        logged_ = true;
    }
    const double sine = portable_sin_turns(0.5 * since_s / burst_.length_s);
    const double wave =
        burst_.amplitude_uv * sine * sine * portable_cos_turns(burst_.phase_turns + burst_.hz * since_s);
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += shares_[i] * wave;
    }
}

} // namespace millpond
