#include "detector/floor_start.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {

FloorStart FloorStart::make(std::size_t lanes, std::uint64_t frames) {
    FloorStart start;
    start.lanes_ = lanes;
    start.frames_ = std::max<std::uint64_t>(frames, 1);
    start.stride_ = std::max<std::uint64_t>(start.frames_ / 256, 1);
    start.capacity_ = static_cast<std::size_t>((start.frames_ + start.stride_ - 1) / start.stride_);
    start.kept_.resize(lanes * start.capacity_);
    return start;
}

bool FloorStart::take(const double* envelopes) noexcept {
    if (seen_ % stride_ == 0) {
        const auto slot = static_cast<std::size_t>(seen_ / stride_);
        for (std::size_t lane = 0; lane < lanes_; ++lane) {
            kept_[lane * capacity_ + slot] = envelopes[lane];
        }
    }
    ++seen_;
    return done();
}

void FloorStart::read(double* mean, double* spread) noexcept {
    const auto middle = static_cast<std::ptrdiff_t>(capacity_ / 2);
    for (std::size_t lane = 0; lane < lanes_; ++lane) {
        const auto first = kept_.begin() + static_cast<std::ptrdiff_t>(lane * capacity_);
        const auto last = first + static_cast<std::ptrdiff_t>(capacity_);
        std::nth_element(first, first + middle, last);
        const double median = first[middle];
        std::transform(first, last, first, [median](double value) { return std::abs(value - median); });
        std::nth_element(first, first + middle, last);
        mean[lane] = median;
        // Median distance to SD is x 1.4826, SD to mean distance is / 1.2533, both for a Gaussian law.
        spread[lane] = first[middle] * (1.4826 / 1.2533);
    }
}

} // namespace millpond
