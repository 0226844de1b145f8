#include "referee/referee.hpp"

#include "base/refusal.hpp"
#include "referee/referee_rules.hpp"

#include <fmt/format.h>

#include <cassert>
#include <cmath>
#include <limits>

namespace millpond {
namespace {

// Twice the band's lower edge is the slowest beat of the squared signal; 3 / (2 pi x 2 low) of smoothing leaves 1 % of
// it.
constexpr double smoothing_cycles = 240.0;

void check_rule(const RefereeSettings& settings, const std::string& where) {
    if (const auto departure = departure_from_rule(settings)) {
        throw Refusal(where + "." + departure->key, departure->found, allowed_instead(*departure, settings.rule));
    }
    if (settings.clip_deviations > 0.0 && settings.clip_deviations < 1.0) {
        throw Refusal(where + ".clip_deviations", fmt::format("{}", settings.clip_deviations), "0 or at least 1");
    }
}

void check(const RefereeSettings& settings, const Channels& channels, Hertz rate, const std::string& where) {
    check_rule(settings, where);
    if (!(settings.low_hz < settings.high_hz && settings.high_hz < rate.value / 2.0)) {
        throw Refusal(where + ".high_hz",
                      fmt::format("{} to {} Hz at {} Hz", settings.low_hz, settings.high_hz, rate.value),
                      fmt::format("low_hz below high_hz below half the rate, {} Hz", rate.value / 2.0));
    }
    if (settings.edge_deviations > settings.peak_deviations) {
        throw Refusal(where + ".edge_deviations", fmt::format("{}", settings.edge_deviations),
                      fmt::format("at most peak_deviations, {}", settings.peak_deviations));
    }
    if (settings.envelope == RefereeEnvelope::summed_energy &&
        settings.smoothing_ms < smoothing_cycles / settings.low_hz) {
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

} // namespace

Referee Referee::make(const RefereeSettings& settings, const Channels& channels, Hertz rate, const std::string& where) {
    check(settings, channels, rate, where);
    return {settings, used_of(channels), rate,
            butterworth_band_pass(Hertz{settings.low_hz}, Hertz{settings.high_hz}, settings.order, rate)};
}

Referee::Used Referee::used_of(const Channels& channels) {
    Used used;
    for (const auto role : {ChannelRole::ripple, ChannelRole::reference}) {
        for (std::size_t i = 0; i < channels.size(); ++i) {
            if (channels[i].role == role) {
                used.channels.push_back(i);
                used.sites += role == ChannelRole::ripple ? 1 : 0;
            }
        }
    }
    return used;
}

Referee::Referee(const RefereeSettings& settings, Used used, Hertz rate, BandPass band)
    : settings_(settings), rate_(rate), used_(std::move(used)), band_(std::move(band), used_.channels.size()),
      analytic_(Hertz{settings.low_hz}, rate, used_.sites),
      watch_(settings.artefacts, used_.channels, used_.channels.size() > used_.sites, rate),
      frame_(used_.channels.size()) {}

bool Referee::missing(std::span<const float> frame) const noexcept {
    for (const auto channel : used_.channels) {
        if (!std::isfinite(frame[channel])) {
            return true;
        }
    }
    return false;
}

// What the band-pass let out becomes the raw envelope.
void Referee::take_band() {
    const std::size_t channels = used_.channels.size();
    for (std::size_t at = 0; at < passed_.size(); at += channels) {
        const auto frame = std::span<const double>(passed_).subspan(at, channels);
        watch_.add_band(frame);
        const auto sites = frame.first(used_.sites);
        if (settings_.envelope == RefereeEnvelope::mean_analytic) {
            analytic_.add(sites, envelope_);
            continue;
        }
        double energy = 0.0;
        for (const double value : sites) {
            energy += value * value;
        }
        envelope_.push_back(static_cast<float>(energy));
    }
    passed_.clear();
}

void Referee::end_run() {
    if (in_run_) {
        band_.end_run(passed_);
        take_band();
        analytic_.end_run(envelope_);
        in_run_ = false;
    }
}

void Referee::skip(std::uint64_t frames) {
    end_run();
    watch_.skip_band(frames);
    envelope_.insert(envelope_.end(), frames, std::numeric_limits<float>::quiet_NaN());
}

void Referee::add(const FrameBlock& block) {
    if (!begun_) {
        first_ = next_ = block.first;
        begun_ = true;
    }
    assert(block.first >= next_);
    if (block.first > next_) {
        watch_.look_at_missing(next_, block.first);
        skip(block.first - next_);
    }
    for (std::size_t f = 0; f < block.frames(); ++f) {
        const auto frame = block.data.subspan(f * block.channels, block.channels);
        const SampleIndex at = block.first + f;
        if (missing(frame)) {
            watch_.look_at_missing(at, at + 1);
            skip(1);
            continue;
        }
        watch_.look(frame, at);
        for (std::size_t i = 0; i < frame_.size(); ++i) {
            frame_[i] = static_cast<double>(frame[used_.channels[i]]);
        }
        in_run_ = true;
        band_.add(frame_, passed_);
        take_band();
    }
    next_ = block.first + block.frames();
}

void Referee::smooth() {
    const bool energies = settings_.envelope == RefereeEnvelope::summed_energy;
    // A sine's amplitude squared is twice its power.
    const float to_mean_amplitude = 2.0F / static_cast<float>(used_.sites);
    for (const auto run : finite_runs(envelope_)) {
        const auto part = std::span(envelope_).subspan(run.from, run.to - run.from);
        smooth_gaussian(part, settings_.smoothing_ms * rate_.value / 1000.0);
        for (float& value : part) {
            value = energies ? std::sqrt(value * to_mean_amplitude) : value;
        }
    }
}

Floor Referee::floor_without(const Intervals& excluded) const {
    std::vector<float> judged;
    judged.reserve(envelope_.size());
    for (const auto& kept : without({{first_, first_ + envelope_.size()}}, excluded)) {
        for (SampleIndex at = kept.from; at < kept.to; at = at + 1) {
            if (const float value = envelope_[at - first_]; !std::isnan(value)) {
                judged.push_back(value);
            }
        }
    }
    return settings_.floor == RefereeFloor::median_and_quartile
               ? median_and_quartile(judged)
               : clipped_mean(judged, settings_.clip_deviations, settings_.clip_again);
}

RefereeFindings Referee::finish() {
    end_run();
    smooth();
    RefereeFindings findings;
    findings.artefacts = watch_.finish(first_, next_);
    const auto floor = floor_without(findings.artefacts.excluded);
    findings.floor = floor.centre;
    findings.spread = floor.spread;
    findings.frames_judged = floor.frames;
    for (const auto run : finite_runs(envelope_)) {
        const auto part = std::span<const float>(envelope_).subspan(run.from, run.to - run.from);
        const auto ripples = pick_ripples(part, first_ + run.from, floor, settings_, rate_);
        findings.ripples.insert(findings.ripples.end(), ripples.begin(), ripples.end());
    }
    findings.dropped_events = std::erase_if(findings.ripples, [&](const Ripple& ripple) {
        return touches(findings.artefacts.excluded, ripple.onset, ripple.end);
    });
    return findings;
}

RefereeFindings find_ripples(const RefereeSettings& settings, const Channels& channels, Hertz rate,
                             const FrameBlock& recording, const std::string& where) {
    auto referee = Referee::make(settings, channels, rate, where);
    referee.add(recording);
    return referee.finish();
}

} // namespace millpond
