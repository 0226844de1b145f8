#include "tuning/floor_bank.hpp"

#include "detector/tiny_is_zero.hpp"

#include <algorithm>
#include <map>

namespace millpond {
namespace {

// As the detector orders them: channels that are looked at in stream order, then the mean where it votes.
struct Columns {
    std::vector<std::size_t> voting, references;
};

Columns columns_of(const DetectorSettings& settings, const Channels& channels) {
    Columns columns;
    std::size_t column = 0;
    for (const auto& channel : channels) {
        if (channel.role == ChannelRole::unused) {
            continue;
        }
        if (channel.role == ChannelRole::reference) {
            columns.references.push_back(column);
        } else if (settings.vote.rule == VoteRule::count) {
            columns.voting.push_back(column);
        }
        ++column;
    }
    if (settings.vote.rule == VoteRule::mean) {
        columns.voting.push_back(column);
    }
    return columns;
}

} // namespace

FloorBank::FloorBank(std::span<const DetectorSettings> settings, const Channels& channels, Hertz rate,
                     const StatisticPass& pass)
    : settings_(settings.size()) {
    const auto columns = columns_of(settings.front(), channels);
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
                together.push_back(settings[places[i]]);
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
    highest_.assign((frames / stride_frames + 1) * used, 0.0);
    for (std::size_t i = 0; i < used; ++i) {
        for (std::size_t frame = 0; frame < frames; ++frame) {
            const double value = statistics[frame * values + columns_[i]];
            double& highest = highest_[frame / stride_frames * used + i];
            envelopes_[frame * used + i] = value;
            highest = value > highest ? value : highest;
        }
    }
    for (auto& batch : batches_) {
        batch.floors.take(first.value, {envelopes_.data(), highest_.data(), used, frames});
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
