#include "tuning/floor_batch.hpp"

#include "detector/detector.hpp"

#include <algorithm>

namespace millpond {
namespace {

constexpr std::int64_t yes = -1, no = 0;
constexpr std::int64_t never = -1;
constexpr double beyond_all = 1e6; // spreads; for lanes without a setting

std::vector<ColumnFloor> floors_of(std::size_t count, std::size_t first) {
    std::vector<ColumnFloor> floors(count);
    for (std::size_t i = 0; i < count; ++i) {
        floors[i].column = first + i;
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
    : start_(FloorStart::make(columns.voting + columns.references, start_frames(settings.front(), rate))),
      settings_(settings.size()), found_(settings.size()), filter_settle_(filter_settle_frames),
      second_(frames_in_ms(1000.0, rate)) {
    state_.voting = floors_of(columns.voting, 0);
    state_.references = floors_of(columns.references, columns.voting);
    state_.needed.values.fill(INT64_MAX); // lanes without a setting never cross
    state_.newest_reference.values.fill(never);
    state_.clip.values.fill(beyond_all);
    state_.clips_below = settings.front().method == DetectionMethod::evidence;
    for (auto* floors : {&state_.voting, &state_.references}) {
        for (auto& column : *floors) {
            column.waited_for.values.fill(beyond_all);
            column.quiet.values.fill(beyond_all);
        }
    }
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
    setting.last_weight = 1.0 / (state_.most_frames[lane] + 1.0);
    state_.needed[lane] = settings.vote.rule == VoteRule::mean ? 1 : settings.vote.sites_needed;
    for (auto& column : state_.voting) {
        column.above[lane] = settings.threshold.deviations * deviation_per_spread;
        column.rearm[lane] = settings.threshold.rearm_deviations * deviation_per_spread;
        column.waited_for[lane] = column.above[lane];
        column.quiet[lane] = std::min(column.above[lane], state_.clip[lane]);
    }
    for (auto& column : state_.references) {
        column.above[lane] = column.waited_for[lane] = settings.veto.deviations * deviation_per_spread;
        column.quiet[lane] = std::min(column.above[lane], state_.clip[lane]);
    }
}

void FloorBatch::gap(std::uint64_t resumes_at) noexcept {
    settling_until_ = resumes_at + filter_settle_;
    state_.counting.values.fill(no);
    state_.any_counting = false;
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
            state_.weight[lane] = active ? settings_[lane].last_weight : 0.0;
        }
        if (position < still_until) {
            next_change_ = std::min(next_change_, still_until);
        }
    }
}

void FloorBatch::take(std::uint64_t first, const EnvelopeBlock& block) {
    std::size_t done = start_.done() ? 0 : begin(first, block);
    while (done < block.frames) {
        const std::uint64_t position = first + done;
        if (position >= next_change_) {
            set_active(position);
        }
        bool due = false;
        done += walk_batch(state_, block, done, done + stretch(position, block.frames - done), first, due);
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
std::size_t FloorBatch::begin(std::uint64_t first, const EnvelopeBlock& block) {
    std::vector<double> mean(block.values), spread(block.values);
    for (std::size_t frame = 0; frame < block.frames; ++frame) {
        bool due = false;
        walk_batch(state_, block, frame, frame + 1, first, due); // a reference counts from its first frame on
        if (first + frame < settling_until_ || !start_.take(block.envelopes + frame * block.values)) {
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
    return block.frames;
}

// After the last frame walked, at `position`: some setting crossed, re-armed or counts how long it is above.
void FloorBatch::decide(std::uint64_t position) {
    bool crossed = false;
    state_.any_counting = state_.any_spent = false;
    for (std::size_t lane = 0; lane < settings_.size(); ++lane) {
        if (state_.spent[lane] != no) {
            if (state_.rearm_votes[lane] < state_.needed[lane]) {
                set_spent(lane, no);
            }
        } else if (state_.votes[lane] >= state_.needed[lane] || state_.counting[lane] != no) {
            crossed = count_above(lane, position) || crossed;
        }
        state_.any_counting = state_.any_counting || state_.counting[lane] != no;
        state_.any_spent = state_.any_spent || state_.spent[lane] != no;
    }
    if (crossed) {
        set_active(position + 1); // what crossed stands still for a while
    }
}

// True where the crossing is due.
bool FloorBatch::count_above(std::size_t lane, std::uint64_t position) {
    auto& setting = settings_[lane];
    setting.above_run = state_.votes[lane] >= state_.needed[lane] ? setting.above_run + 1 : 0;
    if (setting.above_run < setting.min_above) {
        state_.counting[lane] = setting.above_run > 0 ? yes : no;
        return false;
    }
    setting.above_run = 0;
    state_.counting[lane] = no;
    set_spent(lane, yes);
    setting.frozen_until = std::max(setting.frozen_until, position + 1 + setting.freeze);
    const auto reference = state_.newest_reference[lane];
    const bool vetoed = reference != never && position - static_cast<std::uint64_t>(reference) <= setting.veto_window;
    const bool unsettled = state_.warming && state_.frames[lane] < static_cast<double>(setting.settle);
    if (position >= settling_until_ && !unsettled && !vetoed) {
        found_[lane].places.push_back(SampleIndex{position});
    }
    return true;
}

void FloorBatch::set_spent(std::size_t lane, std::int64_t spent) noexcept {
    state_.spent[lane] = spent;
    for (auto& column : state_.voting) {
        column.waited_for[lane] = spent != no ? column.rearm[lane] : column.above[lane];
    }
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
