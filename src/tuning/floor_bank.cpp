#include "tuning/floor_bank.hpp"

#include "detector/evidence_calibration.hpp"
#include "detector/tiny_is_zero.hpp"

#include <algorithm>
#include <limits>
#include <map>

namespace millpond {
namespace {

struct Columns {
    std::vector<std::size_t> voting, references;
};

// As the detector orders its floors: channels that are looked at in stream order, then the mean where it votes; the
// evidence alone with method evidence.
Columns columns_of(const DetectorSettings& settings, const Channels& channels, const EnvelopePass& pass) {
    Columns columns;
    if (settings.method == DetectionMethod::evidence || settings.vote.rule == VoteRule::mean) {
        columns.voting.push_back(pass.floor_column(pass.floor_count() - 1));
    }
    std::size_t floor = 0;
    for (const auto& channel : channels) {
        if (channel.role == ChannelRole::unused || settings.method == DetectionMethod::evidence) {
            continue;
        }
        if (channel.role == ChannelRole::reference) {
            columns.references.push_back(pass.floor_column(floor));
        } else if (settings.vote.rule == VoteRule::count) {
            columns.voting.push_back(pass.floor_column(floor));
        }
        ++floor;
    }
    return columns;
}

// The evidence's threshold follows from the false per minute that are asked for; one site, the evidence, votes.
DetectorSettings with_threshold(DetectorSettings settings) {
    if (settings.method == DetectionMethod::evidence) {
        settings.threshold.deviations = threshold_for(settings.evidence, "detector.evidence");
        settings.threshold.rearm_deviations =
            std::min(settings.threshold.rearm_deviations, settings.threshold.deviations);
        settings.vote.sites_needed = 1;
    }
    return settings;
}

} // namespace

FloorBank::FloorBank(std::span<const DetectorSettings> settings, const Channels& channels, Hertz rate,
                     const EnvelopePass& pass)
    : settings_(settings.size()) {
    const auto columns = columns_of(settings.front(), channels, pass);
    columns_ = columns.voting;
    columns_.insert(columns_.end(), columns.references.begin(), columns.references.end());
    std::map<std::uint64_t, std::vector<std::size_t>> by_start;
    for (std::size_t i = 0; i < settings.size(); ++i) {
        by_start[FloorBatch::start_frames(settings[i], rate)].push_back(i);
    }
    for (const auto& [start, places] : by_start) {
        for (std::size_t from = 0; from < places.size(); from += batch_width) {
            const auto to = std::min(from + batch_width, places.size());
            std::vector<std::size_t> of;
            std::vector<DetectorSettings> together;
            for (std::size_t i = from; i < to; ++i) {
                of.push_back(places[i]);
                together.push_back(with_threshold(settings[places[i]]));
            }
            batches_.push_back({std::move(of), FloorBatch(together, {columns.voting.size(), columns.references.size()},
                                                          rate, pass.settle_frames())});
        }
    }
}

void FloorBank::gap(SampleIndex resumes_at) noexcept {
    for (auto& batch : batches_) {
        batch.floors.gap(resumes_at.value);
    }
}

// Envelopes that nobody compares are left behind: what is read for every batch lies close together.
void FloorBank::take(SampleIndex first, std::span<const double> statistics, std::size_t values) {
    const TinyIsZero tiny_is_zero;
    const std::size_t frames = statistics.size() / values, used = columns_.size();
    envelopes_.resize(frames * used);
    highest_.assign((frames / stride_frames + 1) * used, std::numeric_limits<double>::lowest());
    lowest_.assign((frames / stride_frames + 1) * used, std::numeric_limits<double>::max());
    for (std::size_t i = 0; i < used; ++i) {
        for (std::size_t frame = 0; frame < frames; ++frame) {
            const double value = statistics[frame * values + columns_[i]];
            double& highest = highest_[frame / stride_frames * used + i];
            double& lowest = lowest_[frame / stride_frames * used + i];
            envelopes_[frame * used + i] = value;
            highest = value > highest ? value : highest;
            lowest = value < lowest ? value : lowest;
        }
    }
    for (auto& batch : batches_) {
        batch.floors.take(first.value, {envelopes_.data(), highest_.data(), lowest_.data(), used, frames});
    }
}

std::vector<Detections> FloorBank::detections() {
    std::vector<Detections> all(settings_);
    for (auto& batch : batches_) {
        for (std::size_t i = 0; i < batch.of.size(); ++i) {
            all[batch.of[i]] = std::move(batch.floors.detections()[i]);
        }
    }
    return all;
}

} // namespace millpond
