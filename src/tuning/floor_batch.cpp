#include "tuning/floor_batch.hpp"

#include "detector/detector.hpp"

#include <algorithm>

namespace millpond {
namespace {

constexpr std::int64_t yes = -1, no = 0;
constexpr std::int64_t never = -1;

std::vector<ColumnFloor> floors_of(const std::vector<std::size_t>& columns) {
    std::vector<ColumnFloor> floors(columns.size());
    for (std::size_t i = 0; i < columns.size(); ++i) {
        floors[i].column = columns[i];
    }
    return floors;
}

} // namespace

std::uint64_t FloorBatch::start_frames(const DetectorSettings& settings, Hertz rate) noexcept {
    const auto settle = frames_in_ms(settings.floor.settle_s * 1000.0, rate);
    return std::min(frames_in_ms(1000.0, rate), std::max<std::uint64_t>(settle / 2, 1));
}

FloorBatch::FloorBatch(std::span<const DetectorSettings> settings, const EnvelopeColumns& columns, Hertz rate,
                       std::uint64_t filter_settle_frames)
    : start_(FloorStart::make(columns.all, start_frames(settings.front(), rate))), settings_(settings.size()),
      found_(settings.size()), filter_settle_(filter_settle_frames), second_(frames_in_ms(1000.0, rate)) {
    state_.voting = floors_of(columns.voting);
    state_.references = floors_of(columns.references);
    state_.needed.values.fill(INT64_MAX); // lanes without a setting never cross
    state_.newest_reference.values.fill(never);
    for (std::size_t lane = 0; lane < settings.size(); ++lane) {
        fill(lane, settings[lane], rate);
    }
}

void FloorBatch::fill(std::size_t lane, const DetectorSettings& settings, Hertz rate) {
    auto& setting = settings_[lane];
    setting.freeze = frames_in_ms(settings.floor.freeze_ms, rate);
    setting.min_above = std::max<std::uint64_t>(frames_in_ms(settings.threshold.min_above_ms, rate), 1);
    setting.veto_window = frames_in_ms(settings.veto.window_ms, rate);
    setting.settle = frames_in_ms(settings.floor.settle_s * 1000.0, rate);
    state_.clip[lane] = settings.floor.clip_deviations * deviation_per_spread;
    state_.most_frames[lane] =
        static_cast<double>(std::max<std::uint64_t>(frames_in_ms(settings.floor.time_constant_s * 1000.0, rate), 1));
    state_.needed[lane] = settings.vote.rule == VoteRule::mean ? 1 : settings.vote.sites_needed;
    for (auto& column : state_.voting) {
        column.above[lane] = settings.threshold.deviations * deviation_per_spread;
        column.rearm[lane] = settings.threshold.rearm_deviations * deviation_per_spread;
    }
    for (auto& column : state_.references) {
        column.above[lane] = settings.veto.deviations * deviation_per_spread;
    }
}

void FloorBatch::gap(std::uint64_t resumes_at) noexcept {
    settling_until_ = resumes_at + filter_settle_;
    state_.counting.values.fill(no);
    for (auto& setting : settings_) {
        setting.above_run = 0;
    }
    if (!start_.done()) {
        start_.reset();
    }
    set_active(resumes_at);
}

// Which floors take frames in at `position`, and where that changes next without a decision.
void FloorBatch::set_active(std::uint64_t position) noexcept {
    next_change_ = UINT64_MAX;
    for (std::size_t lane = 0; lane < settings_.size(); ++lane) {
        const auto still_until = std::max(settling_until_, settings_[lane].frozen_until);
        const bool active = start_.done() && position >= still_until;
        state_.active[lane] = active ? yes : no;
        if (!state_.warming) {
            state_.weight[lane] = active ? 1.0 / (state_.most_frames[lane] + 1.0) : 0.0;
        }
        if (position < still_until) {
            next_change_ = std::min(next_change_, still_until);
        }
    }
}

void FloorBatch::take(std::uint64_t first, const double* envelopes, std::size_t values, std::size_t count) {
    std::size_t done = start_.done() ? 0 : begin(first, envelopes, values, count);
    while (done < count) {
        const std::uint64_t position = first + done;
        if (position >= next_change_) {
            set_active(position);
        }
        bool due = false;
        done += walk_batch(state_, envelopes + done * values, values, stretch(position, count - done), position, due);
        if (due) {
            decide(first + done - 1);
        }
        if (state_.warming && (first + done) % second_ == 0) {
            look_at_clock(first + done);
        }
    }
}

// As many frames as share one treatment.
std::size_t FloorBatch::stretch(std::uint64_t position, std::size_t count) const noexcept {
    std::uint64_t end = std::min(position + count, next_change_);
    if (state_.warming) {
        end = std::min(end, (position / second_ + 1) * second_);
    }
    return static_cast<std::size_t>(end - position);
}

// The floor's start: it looks at envelopes, nothing is decided. Returns the frames it took.
std::size_t FloorBatch::begin(std::uint64_t first, const double* envelopes, std::size_t values, std::size_t count) {
    std::vector<double> mean(values), spread(values);
    for (std::size_t frame = 0; frame < count; ++frame, envelopes += values) {
        bool due = false;
        walk_batch(state_, envelopes, values, 1, first + frame, due); // a reference counts from its first frame on
        if (first + frame < settling_until_ || !start_.take(envelopes)) {
            continue;
        }
        start_.read(mean.data(), spread.data());
        for (auto* columns : {&state_.voting, &state_.references}) {
            for (auto& column : *columns) {
                column.mean.values.fill(mean[column.column]);
                column.spread.values.fill(spread[column.column]);
            }
        }
        state_.frames.values.fill(static_cast<double>(start_.frames()));
        set_active(first + frame + 1);
        if ((first + frame + 1) % second_ == 0) {
            look_at_clock(first + frame + 1);
        }
        return frame + 1;
    }
    return count;
}

// After the last frame walked, at `position`: some setting crossed, re-armed or counts how long it is above.
void FloorBatch::decide(std::uint64_t position) {
    for (std::size_t lane = 0; lane < settings_.size(); ++lane) {
        auto& setting = settings_[lane];
        if (state_.spent[lane] != no) {
            state_.spent[lane] = state_.rearm_votes[lane] >= state_.needed[lane] ? yes : no;
            continue;
        }
        setting.above_run = state_.votes[lane] >= state_.needed[lane] ? setting.above_run + 1 : 0;
        state_.counting[lane] = setting.above_run > 0 ? yes : no;
        if (setting.above_run < setting.min_above) {
            continue;
        }
        setting.above_run = 0;
        state_.counting[lane] = no;
        state_.spent[lane] = yes;
        setting.frozen_until = std::max(setting.frozen_until, position + 1 + setting.freeze);
        const auto reference = state_.newest_reference[lane];
        const bool vetoed =
            reference != never && position - static_cast<std::uint64_t>(reference) <= setting.veto_window;
        const bool unsettled = state_.warming && state_.frames[lane] < static_cast<double>(setting.settle);
        if (position >= settling_until_ && !unsettled && !vetoed) {
            found_[lane].places.push_back(SampleIndex{position});
        }
    }
    set_active(position + 1);
}

// The journal says once a second whether a floor has settled. Once all have, and weights stay, nothing is counted.
void FloorBatch::look_at_clock(std::uint64_t position) noexcept {
    bool all_done = true;
    for (std::size_t lane = 0; lane < settings_.size(); ++lane) {
        const bool settled = state_.frames[lane] >= static_cast<double>(settings_[lane].settle);
        if (settled && found_[lane].settled_from.value == UINT64_MAX) {
            found_[lane].settled_from = SampleIndex{position};
        }
        all_done = all_done && settled && state_.frames[lane] >= state_.most_frames[lane];
    }
    if (all_done) {
        state_.warming = false;
        set_active(position);
    }
}

} // namespace millpond
