#include "referee/zero_phase.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <complex>
#include <numbers>

namespace millpond {
namespace {

using Complex = std::complex<double>;

// Bilinear transform of the section whose analog poles are `a` and `b`, gain 1 at the point `centre` of the unit
// circle.
BandSection section_of(Complex a, Complex b, double twice_rate, Complex centre) {
    const Complex p = (twice_rate + a) / (twice_rate - a);
    const Complex q = (twice_rate + b) / (twice_rate - b);
    BandSection section{1.0, -(p + q).real(), (p * q).real()};
    const Complex back = 1.0 / centre;
    const Complex response = (1.0 - back * back) / (1.0 + section.a1 * back + section.a2 * back * back);
    section.gain = 1.0 / std::abs(response);
    return section;
}

double largest_pole(const BandSection& section) {
    const Complex root = std::sqrt(Complex(section.a1 * section.a1 - 4.0 * section.a2));
    return std::max(std::abs((-section.a1 + root) / 2.0), std::abs((-section.a1 - root) / 2.0));
}

} // namespace

std::size_t BandPass::frames_to_decay(double share) const {
    return static_cast<std::size_t>(std::ceil(std::log(share) / std::log(slowest_pole)));
}

BandPass butterworth_band_pass(Hertz low, Hertz high, int order, Hertz rate) {
    assert(0.0 < low.value && low < high && high.value < rate.value / 2.0);
    const double twice_rate = 2.0 * rate.value;
    const double w_low = twice_rate * std::tan(std::numbers::pi * low.value / rate.value);
    const double w_high = twice_rate * std::tan(std::numbers::pi * high.value / rate.value);
    const double square_of_centre = w_low * w_high;
    const double half_width = (w_high - w_low) / 2.0;
    const Complex centre = std::polar(1.0, 2.0 * std::atan(std::sqrt(square_of_centre) / twice_rate));

    BandPass band;
    for (int k = 0; 2 * k < order; ++k) {
        // Prototype poles of the upper half plane; each stands for its conjugate too, except the real one.
        const double angle = std::numbers::pi * (2.0 * k + order + 1.0) / (2.0 * order);
        const Complex mid = half_width * std::polar(1.0, angle);
        const Complex root = std::sqrt(mid * mid - square_of_centre);
        const bool real_pole = 2 * k + 1 == order;
        if (real_pole) {
            const Complex real_root = std::sqrt(Complex(half_width * half_width - square_of_centre));
            band.sections.push_back(section_of(-half_width + real_root, -half_width - real_root, twice_rate, centre));
        } else {
            band.sections.push_back(section_of(mid + root, std::conj(mid + root), twice_rate, centre));
            band.sections.push_back(section_of(mid - root, std::conj(mid - root), twice_rate, centre));
        }
    }
    for (const auto& section : band.sections) {
        band.slowest_pole = std::max(band.slowest_pole, largest_pole(section));
    }
    return band;
}

ZeroPhaseBand::ZeroPhaseBand(BandPass band, std::size_t channels)
    : band_(std::move(band)), channels_(channels), look_ahead_(band_.frames_to_decay(1e-12)), chunk_(4 * look_ahead_),
      forward_state_(band_.sections.size() * 2 * channels), backward_state_(forward_state_.size()), scratch_(channels) {
    passed_.reserve((chunk_ + look_ahead_) * channels_);
}

void ZeroPhaseBand::filter(std::span<double> frame, std::vector<double>& state) const {
    // Transposed direct form II, all channels of one section side by side so that the loop vectorises.
    const std::size_t channels = channels_;
    double* __restrict value = frame.data();
    for (std::size_t k = 0; k < band_.sections.size(); ++k) {
        const auto [gain, a1, a2] = band_.sections[k];
        double* __restrict first = state.data() + 2 * k * channels;
        double* __restrict second = first + channels;
        for (std::size_t i = 0; i < channels; ++i) {
            const double in = gain * value[i];
            const double out = in + first[i];
            first[i] = second[i] - a1 * out;
            second[i] = -in - a2 * out;
            value[i] = out;
        }
    }
}

void ZeroPhaseBand::forward(std::span<const double> frame) {
    if (origin_.empty()) {
        origin_.assign(frame.begin(), frame.end());
        std::fill(forward_state_.begin(), forward_state_.end(), 0.0);
    }
    for (std::size_t i = 0; i < channels_; ++i) {
        scratch_[i] = frame[i] - origin_[i]; // the band-pass answers a constant with 0
    }
    filter(scratch_, forward_state_);
    passed_.insert(passed_.end(), scratch_.begin(), scratch_.end());
}

void ZeroPhaseBand::backward(std::size_t frames, bool at_end, std::size_t wanted, std::vector<double>& out) {
    std::fill(backward_state_.begin(), backward_state_.end(), 0.0);
    const std::size_t start = out.size();
    out.resize(start + wanted * channels_);
    for (std::size_t frame = frames; frame-- > 0;) {
        for (std::size_t i = 0; i < channels_; ++i) {
            const double end_value = at_end ? passed_[(frames - 1) * channels_ + i] : 0.0;
            scratch_[i] = passed_[frame * channels_ + i] - end_value;
        }
        filter(scratch_, backward_state_);
        if (frame < wanted) {
            std::copy(scratch_.begin(), scratch_.end(),
                      out.begin() + static_cast<std::ptrdiff_t>(start + frame * channels_));
        }
    }
    passed_.erase(passed_.begin(), passed_.begin() + static_cast<std::ptrdiff_t>(wanted * channels_));
}

void ZeroPhaseBand::add(std::span<const double> frame, std::vector<double>& passed) {
    assert(frame.size() == channels_);
    forward(frame);
    if (passed_.size() == (chunk_ + look_ahead_) * channels_) {
        backward(chunk_ + look_ahead_, false, chunk_, passed);
    }
}

void ZeroPhaseBand::end_run(std::vector<double>& passed) {
    const std::size_t frames = passed_.size() / channels_;
    backward(frames, true, frames, passed);
    origin_.clear();
}

} // namespace millpond
