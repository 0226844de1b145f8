#include "detector/state_gate.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

constexpr double looks_per_second = 1250.0;
constexpr double blocks_per_second = 250.0;
constexpr double verdicts_per_second = 10.0;
constexpr std::uint64_t most_bridged = 25; // blocks: a tenth of a second, less than a cycle of theta

std::uint64_t rounded(double value) noexcept {
    return static_cast<std::uint64_t>(std::max(std::floor(value + 0.5), 1.0));
}

std::string in_words(double value) {
    auto text = std::to_string(value);
    text.erase(text.find_last_not_of('0') + 1);
    return text.back() == '.' ? text + "0" : text;
}

void check_levels(const StateGateSettings& settings, const std::string& where) {
    if (settings.open_below >= settings.close_above) {
        throw Refusal(where + ".open_below", in_words(settings.open_below),
                      "less than close_above, " + in_words(settings.close_above));
    }
}

bool named_by(const std::string& signal, const Channel& channel) noexcept {
    return (signal == "sites" && channel.role == ChannelRole::ripple) ||
           (signal == "reference" && channel.role == ChannelRole::reference) ||
           (signal == channel.name && channel.role != ChannelRole::unused);
}

} // namespace

StateGate StateGate::make(const StateGateSettings& settings, const Channels& channels, Hertz rate,
                          const std::string& where) {
    StateGate gate;
    gate.settings_ = settings;
    if (!settings.on) {
        return gate;
    }
    check_levels(settings, where);
    std::size_t input = 0;
    for (std::uint32_t i = 0; i < channels.size(); ++i) {
        if (named_by(settings.signal, channels[i])) {
            gate.sources_.push_back({i, input});
        }
        input += channels[i].role == ChannelRole::unused ? 0 : 1;
    }
    if (gate.sources_.empty()) {
        throw Refusal(where + ".signal", "'" + settings.signal + "'",
                      "sites, reference where there is one, or the name of a channel that is not unused");
    }
    gate.stride_ = static_cast<std::uint64_t>(std::max(rate.value / looks_per_second, 1.0));
    const double looks = rate.value / static_cast<double>(gate.stride_);
    gate.block_looks_ = rounded(looks / blocks_per_second);
    const Hertz blocks{looks / static_cast<double>(gate.block_looks_)};
    gate.verdict_frames_ = gate.stride_ * gate.block_looks_ * rounded(blocks.value / verdicts_per_second);
    gate.theta_ = band_of(settings.theta_low_hz, settings.theta_high_hz, blocks, where + ".theta_low_hz");
    gate.delta_ = band_of(settings.delta_low_hz, settings.delta_high_hz, blocks, where + ".delta_low_hz");
    gate.smoothing_ = 1.0 / (1.0 + settings.smoothing_s * blocks.value);
    gate.blocks_needed_ = rounded(std::max(settings.smoothing_s, 1.0) * blocks.value);
    return gate;
}

StateGate::Band StateGate::band_of(double low_hz, double high_hz, Hertz rate, const std::string& where) {
    FilterSettings filter;
    filter.low_hz = low_hz;
    filter.high_hz = high_hz;
    filter.order = 2;
    Band band;
    band.filter = SectionCascade(design_bandpass(filter, rate, where).sections);
    return band;
}

bool StateGate::take(std::uint64_t position, const float* frames, std::size_t count, std::size_t channels) noexcept {
    const std::uint64_t end = position + count;
    for (std::uint64_t look = (position + stride_ - 1) / stride_; look * stride_ < end; ++look) {
        const float* frame = frames + (look * stride_ - position) * channels;
        const bool first = look % block_looks_ == 0;
        for (auto& source : sources_) {
            source.sum = (first ? 0.0 : source.sum) + static_cast<double>(frame[source.channel]);
        }
        looks_ = first ? 1 : looks_ + 1;
        if (look % block_looks_ == block_looks_ - 1 && looks_ == block_looks_) {
            end_block(look / block_looks_);
        }
    }
    return end % verdict_frames_ == 0 && judge();
}

void StateGate::end_block(std::uint64_t number) noexcept {
    double sum = 0.0, used = 0.0;
    for (const auto& source : sources_) {
        sum += source.used ? source.sum : 0.0;
        used += source.used ? 1.0 : 0.0;
    }
    const double value = sum / (used * static_cast<double>(block_looks_));
    const std::uint64_t missing = number - next_block_;
    next_block_ = number + 1;
    if (resume_ || missing > most_bridged) {
        level_ = value - last_;
        resume_ = false;
    } else {
        bridge(missing, value - level_);
    }
    step(value - level_);
}

void StateGate::bridge(std::uint64_t missing, double value) noexcept {
    const double rise = (value - last_) / static_cast<double>(missing + 1);
    for (std::uint64_t i = 0; i < missing; ++i) {
        step(last_ + rise);
    }
}

void StateGate::step(double value) noexcept {
    last_ = value;
    ++blocks_;
    const double weight = std::max(smoothing_, 1.0 / static_cast<double>(blocks_));
    for (auto* band : {&theta_, &delta_}) {
        const double out = band->filter.next(last_);
        band->power += weight * (out * out - band->power);
    }
}

bool StateGate::judge() noexcept {
    if (blocks_ < blocks_needed_) {
        return false;
    }
    const bool was = open_;
    if (open_ && theta_.power > settings_.close_above * delta_.power) {
        open_ = false;
    } else if (!open_ && theta_.power < settings_.open_below * delta_.power) {
        open_ = true;
    }
    return open_ != was;
}

void StateGate::use_alive(const std::vector<bool>& alive) noexcept {
    const bool any =
        std::any_of(sources_.begin(), sources_.end(), [&](const Source& source) { return alive[source.input]; });
    for (auto& source : sources_) {
        source.used = !any || alive[source.input];
    }
    resume_ = true;
}

void StateGate::reset() noexcept {
    for (auto* band : {&theta_, &delta_}) {
        band->filter.clear();
        band->power = 0.0;
    }
    level_ = last_ = 0.0;
    blocks_ = next_block_ = 0;
    resume_ = true;
    open_ = true;
    for (auto& source : sources_) {
        source.used = true;
    }
    splice();
}

} // namespace millpond
