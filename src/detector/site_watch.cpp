#include "detector/site_watch.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

constexpr double looks_per_second = 250.0;
constexpr std::uint32_t seconds_of_memory = 30;

} // namespace

SiteWatch SiteWatch::make(const SiteWatchSettings& settings, const std::vector<ChannelRole>& inputs, Hertz rate) {
    SiteWatch watch;
    watch.settings_ = settings;
    watch.stride_ = std::max<std::uint64_t>(static_cast<std::uint64_t>(rate.value / looks_per_second), 1);
    const auto looks = std::max<std::uint64_t>(frames_in_ms(1000.0, rate) / watch.stride_, 2);
    watch.block_frames_ = looks * watch.stride_;
    watch.looks_needed_ = static_cast<std::uint32_t>(looks / 2); // the rest may have been blanked
    watch.seconds_back_ = static_cast<std::uint32_t>(std::ceil(settings.back_after_s));
    for (const auto role : inputs) {
        Input input;
        input.role = role;
        watch.inputs_.push_back(input);
    }
    watch.alive_.assign(inputs.size(), true);
    watch.sorted_.resize(inputs.size());
    return watch;
}

void SiteWatch::reset() noexcept {
    looks_ = 0;
    for (auto& input : inputs_) {
        const auto role = input.role;
        input = Input{};
        input.role = role;
    }
    std::fill(alive_.begin(), alive_.end(), true);
}

bool SiteWatch::take(std::uint64_t position, const float* frames, std::size_t count, std::size_t channels,
                     const std::uint32_t* channel_of) noexcept {
    const std::uint64_t end = position + count;
    for (std::uint64_t at = (position + stride_ - 1) / stride_ * stride_; at < end; at += stride_) {
        look(frames + (at - position) * channels, channel_of);
    }
    if (end % block_frames_ != 0) {
        return false;
    }
    const bool changed = looks_ >= looks_needed_ && judge();
    looks_ = 0;
    return changed;
}

void SiteWatch::look(const float* frame, const std::uint32_t* channel_of) noexcept {
    for (std::size_t i = 0; i < inputs_.size(); ++i) {
        auto& input = inputs_[i];
        const float value = frame[channel_of[i]];
        if (looks_ == 0) {
            input.least = input.most = input.before = value;
            input.moved = 0.0;
        }
        input.least = std::min(input.least, value);
        input.most = std::max(input.most, value);
        input.moved += std::abs(static_cast<double>(value) - static_cast<double>(input.before));
        input.before = value;
    }
    ++looks_;
}

// True where a channel died or came back.
bool SiteWatch::judge() noexcept {
    bool changed = false;
    const double others_rose = median_rise();
    for (std::size_t i = 0; i < inputs_.size(); ++i) {
        auto& input = inputs_[i];
        const auto now = state_now(input, others_rose);
        if (now == SiteState::alive) {
            ++input.well_seconds;
            if (input.state == SiteState::alive || input.well_seconds >= seconds_back_) {
                input.typical_seconds = std::min(input.typical_seconds + 1, seconds_of_memory);
                input.typical += (input.moved - input.typical) / input.typical_seconds;
            }
        } else {
            input.well_seconds = 0;
        }
        const bool back = input.state != SiteState::alive && input.well_seconds >= seconds_back_;
        const bool lost = now != SiteState::alive && input.state == SiteState::alive && !last_ripple_site(input);
        if (back || lost) {
            input.state = now;
            alive_[i] = now == SiteState::alive;
            changed = true;
        }
    }
    return changed;
}

SiteState SiteWatch::state_now(const Input& input, double others_rose) noexcept {
    if (input.most == input.least) {
        return SiteState::flat;
    }
    // Without a memory of its own a channel is held against the others, which needs at least two of them.
    const bool remembers = input.typical_seconds >= 3;
    const double usual = remembers ? input.typical : (inputs_.size() >= 3 ? median_moved() : 0.0);
    const bool huge = usual > 0.0 && input.moved > settings_.huge_times * usual;
    return huge && others_rose < settings_.huge_times / 4.0 ? SiteState::huge : SiteState::alive;
}

double SiteWatch::median_moved() noexcept {
    return median_of([](const Input& input) { return input.moved; });
}

/// How many times its usual movement the median channel made: what moves all of them is no fault of a site.
double SiteWatch::median_rise() noexcept {
    return median_of([](const Input& input) { return input.typical > 0.0 ? input.moved / input.typical : 0.0; });
}

template <class Figure> double SiteWatch::median_of(Figure figure) noexcept {
    std::transform(inputs_.begin(), inputs_.end(), sorted_.begin(), figure);
    const auto middle = sorted_.begin() + static_cast<std::ptrdiff_t>((sorted_.size() - 1) / 2);
    std::nth_element(sorted_.begin(), middle, sorted_.end());
    return *middle;
}

bool SiteWatch::last_ripple_site(const Input& input) const noexcept {
    return input.role == ChannelRole::ripple && std::count_if(inputs_.begin(), inputs_.end(), [](const Input& other) {
                                                    return other.role == ChannelRole::ripple &&
                                                           other.state == SiteState::alive;
                                                }) == 1;
}

} // namespace millpond
