#include "referee/analytic_envelope.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

namespace millpond {
namespace {

// Kaiser 1974: beta and length for a ripple of `decibels` and a transition of `width` (radians a frame); from memory.
constexpr double decibels = 60.0;

// Modified Bessel function of the first kind, order 0, by its power series.
double bessel_i0(double x) {
    double sum = 1.0, term = 1.0;
    for (int k = 1; term > 1e-16 * sum; ++k) {
        term *= (x / (2.0 * k)) * (x / (2.0 * k));
        sum += term;
    }
    return sum;
}

// The jump at 0 is as wide as the transition, half of it on either side.
std::vector<float> hilbert_taps(double width) {
    const double beta = 0.1102 * (decibels - 8.7);
    const auto radius = static_cast<std::size_t>(std::ceil((decibels - 8.0) / (2.285 * width) / 2.0)) | 1U;
    std::vector<float> taps;
    for (std::size_t n = 1; n <= radius; n += 2) {
        const double share = static_cast<double>(n) / static_cast<double>(radius + 1);
        const double window = bessel_i0(beta * std::sqrt(1.0 - share * share)) / bessel_i0(beta);
        taps.push_back(static_cast<float>(2.0 / (std::numbers::pi * static_cast<double>(n)) * window));
    }
    return taps;
}

} // namespace

AnalyticEnvelope::AnalyticEnvelope(Hertz low, Hertz rate, std::size_t sites)
    : sites_(sites), taps_(hilbert_taps(2.0 * std::numbers::pi * low.value / rate.value)),
      radius_(2 * taps_.size() - 1), shifted_(sites) {}

void AnalyticEnvelope::begin_run() {
    waits_.assign(radius_ * sites_, 0.0F);
    next_ = radius_;
    running_ = true;
}

void AnalyticEnvelope::add(std::span<const double> frame, std::vector<float>& envelope) {
    assert(frame.size() == sites_);
    if (!running_) {
        begin_run();
    }
    for (const double value : frame) {
        waits_.push_back(static_cast<float>(value));
    }
    if (waits_.size() == (next_ + radius_ + 1) * sites_) {
        answer(envelope);
    }
}

void AnalyticEnvelope::answer(std::vector<float>& envelope) {
    std::fill(shifted_.begin(), shifted_.end(), 0.0F);
    const float* centre = waits_.data() + next_ * sites_;
    for (std::size_t k = 0; k < taps_.size(); ++k) {
        const float tap = taps_[k];
        const float* before = centre - (2 * k + 1) * sites_;
        const float* after = centre + (2 * k + 1) * sites_;
        for (std::size_t i = 0; i < sites_; ++i) {
            shifted_[i] += tap * (before[i] - after[i]);
        }
    }
    double sum = 0.0;
    for (std::size_t i = 0; i < sites_; ++i) {
        sum += std::hypot(static_cast<double>(centre[i]), static_cast<double>(shifted_[i]));
    }
    envelope.push_back(static_cast<float>(sum / static_cast<double>(sites_)));
    ++next_;
    constexpr std::size_t block = 4096; // frames kept before the answered ones are let go
    if (next_ == radius_ + block) {
        waits_.erase(waits_.begin(), waits_.begin() + static_cast<std::ptrdiff_t>(block * sites_));
        next_ = radius_;
    }
}

void AnalyticEnvelope::end_run(std::vector<float>& envelope) {
    if (!running_) {
        return;
    }
    waits_.resize(waits_.size() + radius_ * sites_, 0.0F);
    while (next_ + radius_ < waits_.size() / sites_) {
        answer(envelope);
    }
    running_ = false;
}

} // namespace millpond
