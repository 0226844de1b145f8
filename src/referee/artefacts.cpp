#include "referee/artefacts.hpp"

#include "referee/envelope_rules.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace millpond {
namespace {

constexpr double bin_ms = 10.0;
// Clipping keeps artefacts and ripples out of their own measure, as in the referee's default.
constexpr double clip_deviations = 3.0;

void append(Intervals& intervals, Interval next) {
    if (!intervals.empty() && intervals.back().to >= next.from) {
        intervals.back().to = std::max(intervals.back().to, next.to);
    } else {
        intervals.push_back(next);
    }
}

Intervals padded(const Intervals& intervals, std::uint64_t pad, SampleIndex first, SampleIndex end) {
    Intervals wider;
    for (const auto& each : intervals) {
        const SampleIndex from{each.from - first > pad ? each.from.value - pad : first.value};
        append(wider, {from, std::min(each.to + pad, end)});
    }
    return wider;
}

// The level that a channel's envelope passes when it rises; without any value, or in silence, it never does.
double level_of(const std::vector<float>& rises, double deviations) {
    std::vector<float> there;
    std::copy_if(rises.begin(), rises.end(), std::back_inserter(there), [](float value) { return !std::isnan(value); });
    const auto floor = clipped_mean(there, clip_deviations, true);
    return floor.spread > 0.0 ? floor.centre + deviations * floor.spread : std::numeric_limits<double>::infinity();
}

} // namespace

ArtefactWatch::ArtefactWatch(const RefereeArtefactSettings& settings, std::vector<std::size_t> channels,
                             bool with_reference, Hertz rate)
    : settings_(settings), rate_(rate), common_(settings.exclude && with_reference && settings.common_deviations > 0.0),
      flat_frames_(frames_in_ms(settings.flat_ms, rate)), bin_frames_(frames_in_ms(bin_ms, rate)) {
    for (const auto place : channels) {
        channels_.push_back({place, 0.0F, {}, {}, false, false, {}, {}, {}, 0.0});
    }
}

void ArtefactWatch::let_go(Watched& channel, SampleIndex at) const {
    if (channel.holding && flat_frames_ > 1 && at - channel.since >= flat_frames_) {
        append(channel.flat, {channel.since, at});
    }
    channel.holding = false;
}

void ArtefactWatch::leave_rail(Watched& channel, SampleIndex at) const {
    if (channel.at_rail) {
        append(channel.railed, {channel.rail_since, at});
    }
    channel.at_rail = false;
}

void ArtefactWatch::look(std::span<const float> frame, SampleIndex at) {
    for (auto& channel : channels_) {
        const float value = frame[channel.place];
        if (!channel.holding || value != channel.value) {
            let_go(channel, at);
            channel.holding = true;
            channel.value = value;
            channel.since = at;
        }
        const bool at_rail = settings_.rail_uv > 0.0 && std::abs(static_cast<double>(value)) >= settings_.rail_uv;
        if (!at_rail) {
            leave_rail(channel, at);
        } else if (!channel.at_rail) {
            channel.at_rail = true;
            channel.rail_since = at;
        }
    }
}

void ArtefactWatch::look_at_missing(SampleIndex from, SampleIndex to) {
    for (auto& channel : channels_) {
        let_go(channel, from);
        leave_rail(channel, from);
    }
    append(missing_, {from, to});
}

void ArtefactWatch::add_band(std::span<const double> frame) {
    if (!common_) {
        return;
    }
    for (std::size_t i = 0; i < channels_.size(); ++i) {
        channels_[i].energy += frame[i] * frame[i];
    }
    ++present_;
    if (++in_bin_ == bin_frames_) {
        close_bin();
    }
}

void ArtefactWatch::skip_band(std::uint64_t frames) {
    for (; common_ && frames > 0; --frames) {
        if (++in_bin_ == bin_frames_) {
            close_bin();
        }
    }
}

void ArtefactWatch::close_bin() {
    for (auto& channel : channels_) {
        channel.rises.push_back(present_ == 0
                                    ? std::numeric_limits<float>::quiet_NaN()
                                    : static_cast<float>(std::sqrt(channel.energy / static_cast<double>(present_))));
        channel.energy = 0.0;
    }
    in_bin_ = present_ = 0;
}

Intervals ArtefactWatch::common_rises(const std::vector<bool>& dead, SampleIndex first) const {
    std::vector<std::pair<const Watched*, double>> alive;
    for (std::size_t i = 0; i < channels_.size(); ++i) {
        if (!dead[i]) {
            alive.emplace_back(&channels_[i], level_of(channels_[i].rises, settings_.common_deviations));
        }
    }
    Intervals found;
    const std::size_t bins = alive.empty() ? 0 : alive.front().first->rises.size();
    for (std::size_t bin = 0; bin < bins; ++bin) {
        const bool all = std::all_of(alive.begin(), alive.end(), [&](const auto& channel) {
            return static_cast<double>(channel.first->rises[bin]) > channel.second;
        });
        if (all) {
            append(found, {first + bin * bin_frames_, first + (bin + 1) * bin_frames_});
        }
    }
    return found;
}

ArtefactFindings ArtefactWatch::finish(SampleIndex first, SampleIndex end) {
    ArtefactFindings findings;
    if (!settings_.exclude) {
        return findings;
    }
    Intervals all = missing_;
    std::vector<bool> dead(channels_.size());
    for (std::size_t i = 0; i < channels_.size(); ++i) {
        auto& channel = channels_[i];
        let_go(channel, end);
        leave_rail(channel, end);
        dead[i] = 2 * std::max(frames_in(channel.flat), frames_in(channel.railed)) >= end - first && end > first;
        if (dead[i]) {
            findings.dead_channels.push_back(channel.place);
            continue;
        }
        findings.flat += channel.flat.size();
        findings.railed += channel.railed.size();
        all.insert(all.end(), channel.flat.begin(), channel.flat.end());
        all.insert(all.end(), channel.railed.begin(), channel.railed.end());
    }
    if (in_bin_ > 0) {
        close_bin();
    }
    const auto common = common_ ? common_rises(dead, first) : Intervals{};
    all.insert(all.end(), common.begin(), common.end());
    findings.missing = missing_.size();
    findings.common = common.size();
    std::sort(all.begin(), all.end(), [](const Interval& a, const Interval& b) { return a.from < b.from; });
    findings.excluded = padded(all, frames_in_ms(settings_.pad_ms, rate_), first, end);
    return findings;
}

} // namespace millpond
