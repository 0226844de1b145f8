#include "tuning/floor_bank.hpp"

#include "detector/tiny_is_zero.hpp"

#include <algorithm>
#include <map>

namespace millpond {
namespace {

// As the detector orders them: channels that are looked at in stream order, then the mean where it votes.
EnvelopeColumns columns_of(const DetectorSettings& settings, const Channels& channels, std::size_t all) {
    EnvelopeColumns columns;
    columns.all = all;
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
            const auto columns = columns_of(settings.front(), channels, pass.values());
            batches_.push_back({std::move(of), FloorBatch(together, columns, rate, pass.settle_frames())});
        }
    }
}

void FloorBank::gap(SampleIndex resumes_at) noexcept {
    for (auto& batch : batches_) {
        batch.floors.gap(resumes_at.value);
    }
}

void FloorBank::take(SampleIndex first, std::span<const double> statistics, std::size_t values) {
    const TinyIsZero tiny_is_zero;
    const std::size_t frames = statistics.size() / values;
    highest_.assign((frames / stride_frames + 1) * values, 0.0);
    for (std::size_t frame = 0; frame < frames; ++frame) {
        double* const highest = highest_.data() + frame / stride_frames * values;
        for (std::size_t i = 0; i < values; ++i) {
            const double value = statistics[frame * values + i];
            highest[i] = value > highest[i] ? value : highest[i];
        }
    }
    for (auto& batch : batches_) {
        batch.floors.take(first.value, {statistics.data(), highest_.data(), values, frames});
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
