#include "detector/mains_removal.hpp"

#include "base/portable_math.hpp"
#include "base/refusal.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

constexpr double step_ms = 250.0;
constexpr double level_ms = 100.0; // time in which an offset that a splice left behind is forgotten
constexpr double most_off_hz = 1.0;
constexpr double share_of_step = 0.2; // of the frequency's error that one step takes away

} // namespace

void MainsRemoval::prepare(const MainsRemovalSettings& settings, Hertz rate, KernelState& lanes,
                           const std::string& where) {
    if (settings.method == MainsMethod::off) {
        return;
    }
    const double highest = 0.45 * rate.value;
    if (settings.frequency_hz > highest) {
        throw Refusal(where + ".frequency_hz", std::to_string(settings.frequency_hz),
                      "at most 0.45 of the rate, " + std::to_string(highest));
    }
    rate_ = rate;
    nominal_hz_ = settings.frequency_hz;
    harmonics_ = std::min(static_cast<std::size_t>(settings.harmonics),
                          static_cast<std::size_t>(highest / settings.frequency_hz));
    lane_count_ = lanes.lanes;
    step_frames_ = frames_in_ms(step_ms, rate);
    for (auto* values : {&in_phase_, &quadrature_, &in_phase_before_, &quadrature_before_}) {
        *values = Lanes<double>(harmonics_ * lane_count_);
    }
    const std::size_t padded = (harmonics_ + lane_group - 1) / lane_group * lane_group;
    for (auto* values : {&cosine_, &sine_, &turn_cosine_, &turn_sine_}) {
        *values = Lanes<double>(padded);
    }
    calm_ = Lanes<double>(lane_count_);
    const double frames = settings.time_constant_s * rate.value;
    auto& hum = lanes.hum;
    hum.harmonics = harmonics_;
    hum.oscillators = padded;
    hum.in_phase = in_phase_.data();
    hum.quadrature = quadrature_.data();
    hum.cosine = cosine_.data();
    hum.sine = sine_.data();
    hum.turn_cosine = turn_cosine_.data();
    hum.turn_sine = turn_sine_.data();
    hum.calm = calm_.data();
    hum.gain = std::min(2.0 / frames, 0.1);
    hum.level_follow = 1000.0 / (level_ms * rate.value);
    hum.calm_weight = 1.0 / (1.0 + frames);
    hum.calm_needed = frames_in_ms(1000.0, rate);
}

void MainsRemoval::reset(KernelState& lanes) noexcept {
    for (auto* values : {&in_phase_, &quadrature_, &calm_}) {
        values->fill(0.0);
    }
    lanes.hum.calm_frames = 0;
    frequency_hz_ = nominal_hz_;
    turns_ = 0.0;
    anchor_ = reached_ = 0;
    if (on()) {
        remember();
        set_oscillators(0);
    }
}

void MainsRemoval::begin(std::uint64_t position) noexcept {
    if (position != reached_) {
        broken_ = true;
        set_oscillators(position);
    }
}

void MainsRemoval::end(std::uint64_t position) noexcept {
    reached_ = position;
    if (position % step_frames_ != 0) {
        return;
    }
    const double turns = turns_ + frequency_hz_ * static_cast<double>(position - anchor_) / rate_.value;
    if (!broken_) {
        const double off_hz = turned() * rate_.value / static_cast<double>(position - anchor_);
        frequency_hz_ =
            std::clamp(frequency_hz_ + share_of_step * off_hz, nominal_hz_ - most_off_hz, nominal_hz_ + most_off_hz);
    }
    turns_ = turns - std::floor(turns);
    anchor_ = position;
    remember();
    set_oscillators(position);
}

void MainsRemoval::remember() noexcept {
    for (std::size_t i = 0; i < in_phase_.size(); ++i) {
        in_phase_before_[i] = in_phase_[i];
        quadrature_before_[i] = quadrature_[i];
    }
    broken_ = false;
}

// How far, in turns of the first multiple, hum has turned against the oscillators since the last step: the mean over
// lanes and multiples, each counting by its power.
double MainsRemoval::turned() const noexcept {
    double angle = 0.0, weight = 0.0;
    for (std::size_t h = 0; h < harmonics_; ++h) {
        double along = 0.0, across = 0.0;
        for (std::size_t i = h * lane_count_; i < (h + 1) * lane_count_; ++i) {
            along += in_phase_[i] * in_phase_before_[i] + quadrature_[i] * quadrature_before_[i];
            across += in_phase_[i] * quadrature_before_[i] - quadrature_[i] * in_phase_before_[i];
        }
        const double multiple = static_cast<double>(h + 1);
        angle += multiple * across;
        weight += multiple * multiple * std::sqrt(along * along + across * across);
    }
    return weight > 0.0 ? angle / weight * 0.15915494309189533577 : 0.0;
}

void MainsRemoval::set_oscillators(std::uint64_t position) noexcept {
    const double at = turns_ + frequency_hz_ * static_cast<double>(position - anchor_) / rate_.value;
    for (std::size_t h = 0; h < harmonics_; ++h) {
        const double multiple = static_cast<double>(h + 1);
        const double turns = multiple * (at - std::floor(at));
        const double step = multiple * frequency_hz_ / rate_.value;
        cosine_[h] = portable_cos_turns(turns);
        sine_[h] = portable_sin_turns(turns);
        turn_cosine_[h] = portable_cos_turns(step);
        turn_sine_[h] = portable_sin_turns(step);
    }
}

} // namespace millpond
