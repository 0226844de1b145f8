#include "referee/referee.hpp"

#include "base/refusal.hpp"
#include "referee/envelope_rules.hpp"

#include <fmt/format.h>

#include <cassert>
#include <cmath>
#include <limits>

namespace millpond {
namespace {

// Twice the band's lower edge is the slowest beat of the squared signal; 3 / (2 pi x 2 low) of smoothing leaves 1 % of
// it.
constexpr double smoothing_cycles = 240.0;

void check(const RefereeSettings& settings, const Channels& channels, Hertz rate, const std::string& where) {
    if (!(settings.low_hz < settings.high_hz && settings.high_hz < rate.value / 2.0)) {
        throw Refusal(where + ".high_hz",
                      fmt::format("{} to {} Hz at {} Hz", settings.low_hz, settings.high_hz, rate.value),
                      fmt::format("low_hz below high_hz below half the rate, {} Hz", rate.value / 2.0));
    }
    if (settings.edge_deviations > settings.peak_deviations) {
        throw Refusal(where + ".edge_deviations", fmt::format("{}", settings.edge_deviations),
                      fmt::format("at most peak_deviations, {}", settings.peak_deviations));
    }
    if (settings.smoothing_ms < smoothing_cycles / settings.low_hz) {
        throw Refusal(where + ".smoothing_ms", fmt::format("{}", settings.smoothing_ms),
                      fmt::format("at least 240 / low_hz, {:.2f} ms", smoothing_cycles / settings.low_hz));
    }
    for (const auto& channel : channels) {
        if (channel.role == ChannelRole::ripple) {
            return;
        }
    }
    throw Refusal(where, "no channel of role ripple", "one or more");
}

std::size_t ripple_sites(const Channels& channels) {
    std::size_t count = 0;
    for (const auto& channel : channels) {
        count += channel.role == ChannelRole::ripple ? 1 : 0;
    }
    return count;
}

} // namespace

Referee Referee::make(const RefereeSettings& settings, const Channels& channels, Hertz rate, const std::string& where) {
    check(settings, channels, rate, where);
    return {settings, channels, rate,
            butterworth_band_pass(Hertz{settings.low_hz}, Hertz{settings.high_hz}, settings.order, rate)};
}

Referee::Referee(const RefereeSettings& settings, const Channels& channels, Hertz rate, BandPass band)
    : settings_(settings), rate_(rate), energy_(std::move(band), ripple_sites(channels)),
      frame_(ripple_sites(channels)) {
    for (std::size_t i = 0; i < channels.size(); ++i) {
        if (channels[i].role == ChannelRole::ripple) {
            sites_.push_back(i);
        }
        if (channels[i].role != ChannelRole::unused) {
            used_.push_back(i);
        }
    }
}

bool Referee::missing(std::span<const float> frame) const noexcept {
    for (const auto channel : used_) {
        if (!std::isfinite(frame[channel])) {
            return true;
        }
    }
    return false;
}

void Referee::skip(std::uint64_t frames) {
    if (in_run_) {
        energy_.end_run(envelope_);
        in_run_ = false;
    }
    envelope_.insert(envelope_.end(), frames, std::numeric_limits<float>::quiet_NaN());
}

void Referee::add(const FrameBlock& block) {
    if (!begun_) {
        first_ = next_ = block.first;
        begun_ = true;
    }
    assert(block.first >= next_);
    if (block.first > next_) {
        skip(block.first - next_);
    }
    for (std::size_t f = 0; f < block.frames(); ++f) {
        const auto frame = block.data.subspan(f * block.channels, block.channels);
        if (missing(frame)) {
            skip(1);
            continue;
        }
        for (std::size_t i = 0; i < sites_.size(); ++i) {
            frame_[i] = static_cast<double>(frame[sites_[i]]);
        }
        energy_.add(frame_, envelope_);
        in_run_ = true;
    }
    next_ = block.first + block.frames();
}

RefereeFindings Referee::finish() {
    skip(0);
    const auto runs = finite_runs(envelope_);
    const float to_mean_amplitude =
        2.0F / static_cast<float>(sites_.size()); // a sine's amplitude squared is twice its power
    for (const auto run : runs) {
        const auto part = std::span(envelope_).subspan(run.from, run.to - run.from);
        smooth_gaussian(part, settings_.smoothing_ms * rate_.value / 1000.0);
        for (float& value : part) {
            value = std::sqrt(value * to_mean_amplitude);
        }
    }
    const auto floor = clipped_statistics(envelope_, settings_.clip_deviations);
    RefereeFindings findings{{}, floor.mean, floor.deviation, floor.frames};
    for (const auto run : runs) {
        const auto part = std::span<const float>(envelope_).subspan(run.from, run.to - run.from);
        const auto ripples = pick_ripples(part, first_ + run.from, floor, settings_, rate_);
        findings.ripples.insert(findings.ripples.end(), ripples.begin(), ripples.end());
    }
    return findings;
}

RefereeFindings find_ripples(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                             const FrameBlock& recording) {
    auto referee = Referee::make(settings, channels, rate);
    referee.add(recording);
    return referee.finish();
}

} // namespace millpond
