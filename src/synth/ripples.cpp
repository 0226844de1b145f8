#include "synth/ripples.hpp"

#include "base/refusal.hpp"

#include <string>

namespace millpond {
namespace {

constexpr double tenth = 0.1;
/// Where sin^2(pi x / 2) is a tenth: x = (2 / pi) asin(sqrt(0.1)).
constexpr double tenth_at = 0.204832764699133;
constexpr double doublet_gap_ms = 20.0; ///< least time from a ripple's end to the onset of one that follows it
constexpr double most_deviations = 2.5; ///< log-normal values beyond are drawn again: no absurd ripples

/// 0 at 0, 1 at 1.
double half_hann(double x) noexcept {
    const double sine = portable_sin_turns(0.25 * x);
    return sine * sine;
}

} // namespace

double RippleTrain::Ripple::envelope(double t) const noexcept {
    if (t <= begin_s || t >= stop_s) {
        return 0.0;
    }
    const double shape =
        t < peak_s ? half_hann((t - begin_s) / (peak_s - begin_s)) : half_hann((stop_s - t) / (stop_s - peak_s));
    return shape * cut_gain(t);
}

double RippleTrain::Ripple::cut_gain(double t) const noexcept {
    if (t <= cut_s) {
        return 1.0;
    }
    return t >= cut_s + fall_s ? 0.0 : half_hann(1.0 - (t - cut_s) / fall_s);
}

RippleTrain::RippleTrain(const SceneSettings& settings, std::vector<ChannelGains> gains,
                         std::shared_ptr<const States> states)
    : ripples_(settings.ripples), sharp_wave_(settings.sharp_wave), rate_{settings.rate_hz},
      duration_s_(settings.duration_s), gains_(std::move(gains)), states_(std::move(states)),
      ripples_in_run_(settings.states.ripples_in_run), random_(settings.seed, number_of(RandomStream::ripples)),
      more_(settings.seed, number_of(RandomStream::more_of_ripples)) {
    mean_wait_s_ = ripples_.rate_per_s == 0.0 ? 0.0 : mean_wait_s();
    draw_next(settings.quiet_start_s);
}

/// Of p followed by another each, one in 1 - p begins a chain, which takes as much longer as it has more ripples.
double RippleTrain::mean_wait_s() const {
    const double first_s = (ripples_.duration_ms + ripples_.min_gap_ms) / 1000.0;
    const double apart_s =
        std::max(0.5 * (ripples_.doublet_least_ms + ripples_.doublet_most_ms), ripples_.duration_ms + doublet_gap_ms) /
        1000.0;
    const double followed = ripples_.doublet_share;
    return 1.0 / (ripples_.rate_per_s * (1.0 - followed)) - first_s - followed / (1.0 - followed) * apart_s;
}

double RippleTrain::draw_onset(double not_before_s) {
    if (next_.onset_s > 0.0 && ripples_.doublet_share > 0.0 && more_.uniform() < ripples_.doublet_share) {
        const double range_ms = ripples_.doublet_most_ms - ripples_.doublet_least_ms;
        const double apart_s = (ripples_.doublet_least_ms + range_ms * more_.uniform()) / 1000.0;
        return std::max(next_.onset_s + apart_s, next_.end_s + doublet_gap_ms / 1000.0);
    }
    double onset_s = not_before_s + random_.exponential(mean_wait_s_);
    while (states_->runs_at(onset_s) && onset_s < duration_s_ && more_.uniform() >= ripples_in_run_) {
        onset_s += random_.exponential(mean_wait_s_);
    }
    return onset_s;
}

double RippleTrain::share(const Ripple& ripple, std::size_t channel) const noexcept {
    if (ripple.depth_um == 0.0 || gains_[channel].reference) {
        return gains_[channel].ripple;
    }
    const double spread = (gains_[channel].below_um - ripple.depth_um) / ripples_.spread_um;
    return portable_exp(-0.5 * spread * spread);
}

void RippleTrain::draw_next(double not_before_s) {
    constexpr double never = std::numeric_limits<double>::infinity();
    if (ripples_.rate_per_s == 0.0) {
        next_.begin_s = next_.sharp_begin_s = never;
        return;
    }
    const double onset_s = draw_onset(not_before_s);
    next_ = Ripple{};
    next_.begin_s = next_.sharp_begin_s = never;
    const double log_sd = ripples_.duration_log_sd;
    const double log_mean = portable_log(ripples_.duration_ms / 1000.0) - 0.5 * log_sd * log_sd;
    const double duration_s = portable_exp(log_mean + log_sd * random_.normal_within(most_deviations));
    double size = portable_exp(ripples_.amplitude_log_sd * random_.normal_within(most_deviations));
    const double shift_hz = ripples_.frequency_sd_hz * random_.normal_within(most_deviations);
    const double phase_turns = random_.uniform();
    const double depth_um = ripples_.depth_sd_um * more_.normal_within(most_deviations);
    size *= more_.uniform() < ripples_.small_share ? ripples_.small_size : 1.0;

    // Between the tenths lies all but tenth_at of the whole envelope, of its rise as of its fall.
    const double whole_s = duration_s / (1.0 - tenth_at);
    Ripple ripple{};
    ripple.onset_s = onset_s;
    ripple.end_s = onset_s + duration_s;
    ripple.begin_s = onset_s - tenth_at * ripples_.rise_share * whole_s;
    ripple.peak_s = ripple.begin_s + ripples_.rise_share * whole_s;
    ripple.stop_s = ripple.begin_s + whole_s;
    ripple.sharp_begin_s = ripple.peak_s - sharp_wave_.duration_ms / 2000.0;
    ripple.sharp_stop_s = ripple.peak_s + sharp_wave_.duration_ms / 2000.0;
    ripple.amplitude_uv = ripples_.amplitude_uv * size;
    ripple.sharp_wave_uv = sharp_wave_.amplitude_uv * size;
    ripple.hz_per_s = (ripples_.end_hz - ripples_.start_hz) / duration_s;
    ripple.peak_hz = ripples_.start_hz + shift_hz + ripple.hz_per_s * (ripple.peak_s - onset_s);
    ripple.phase_turns = phase_turns;
    ripple.depth_um = depth_um;
    // No ripple that the recording's end would cut: its truth could not be told.
    if (ripple.last_s() < duration_s_) {
        next_ = ripple;
    }
}

void RippleTrain::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    while (next_.first_s() <= t) {
        active_.push_back(next_);
        draw_next(next_.end_s + ripples_.min_gap_ms / 1000.0);
    }
    for (auto& ripple : active_) {
        add_one(ripple, at, frame);
    }
    // In order of their begin, so that the truth is in order though a short one may end before a long one's last trace.
    while (!active_.empty() && active_.front().last_s() <= t) {
        // A pulse may have cut it before its envelope was ever above a tenth: then there was no ripple.
        if (active_.front().largest > tenth) {
            truth_.push_back(active_.front().truth);
        }
        active_.erase(active_.begin());
    }
}

void RippleTrain::add_one(Ripple& ripple, SampleIndex at, std::span<double> frame) const {
    const double t = seconds_at(at, rate_);
    const double envelope = ripple.envelope(t);
    if (envelope > tenth) {
        ripple.truth.onset = ripple.largest > tenth ? ripple.truth.onset : at;
        ripple.truth.end = at;
    }
    if (envelope > ripple.largest) {
        ripple.largest = envelope;
        ripple.truth.peak = at;
        double largest_share = 0.0;
        for (std::size_t i = 0; i < frame.size(); ++i) {
            largest_share = std::max(largest_share, share(ripple, i));
        }
        ripple.truth.amplitude_uv = envelope * ripple.amplitude_uv * largest_share;
        ripple.truth.frequency_hz = ripple.peak_hz;
    }
    const double since_peak_s = t - ripple.peak_s;
    const double turns = ripple.phase_turns + since_peak_s * (ripple.peak_hz + 0.5 * ripple.hz_per_s * since_peak_s);
    const double wave = ripple.amplitude_uv * envelope * portable_cos_turns(turns);
    const double distance = std::abs(since_peak_s) * 2000.0 / sharp_wave_.duration_ms;
    const double sharp = distance < 1.0 ? ripple.sharp_wave_uv * half_hann(1.0 - distance) * ripple.cut_gain(t) : 0.0;
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] += share(ripple, i) * wave + gains_[i].sharp_wave * sharp;
    }
}

void RippleTrain::cut(SampleIndex now, double delay_ms, double fall_ms) {
    const double t = seconds_at(now, rate_);
    for (auto& ripple : active_) {
        const double cut_s = t + delay_ms / 1000.0;
        if (ripple.onset_s <= t && t <= ripple.end_s && cut_s < std::min(ripple.cut_s, ripple.end_s)) {
            ripple.cut_s = cut_s;
            ripple.fall_s = fall_ms / 1000.0;
            ripple.truth.cut = true;
        }
    }
}

} // namespace millpond
