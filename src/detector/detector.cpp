#include "detector/detector.hpp"

#include "detector/detector_state.hpp"
#include "detector/tiny_is_zero.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {

Detector::Detector(std::unique_ptr<State> state) noexcept : state_(std::move(state)) {}
Detector::Detector(Detector&&) noexcept = default;
Detector& Detector::operator=(Detector&&) noexcept = default;
Detector::~Detector() = default;

std::size_t Detector::run(const FrameBlock& block, std::optional<Crossing>& crossing) noexcept {
    const TinyIsZero tiny_is_zero;
    auto& s = *state_;
    crossing.reset();
    std::size_t used = 0;
    const std::size_t count = block.frames();
    while (used < count) {
        if (s.position >= s.blank_from) {
            used += s.skip_blanked(count - used);
            continue;
        }
        used += s.advance(block.part(used, count - used), crossing);
        if (crossing || s.sites_changed || s.state_changed) {
            break;
        }
    }
    return used;
}

void Detector::envelopes(const FrameBlock& block, std::span<double> out, std::span<unsigned char> jumped) noexcept {
    const TinyIsZero tiny_is_zero;
    auto& s = *state_;
    for (std::size_t done = 0; done < block.frames();) {
        const auto rest = block.part(done, block.frames() - done);
        KernelOrder order;
        order.frames = rest.data.data();
        order.count = static_cast<std::size_t>(std::min<std::uint64_t>(rest.frames(), s.frames_to_verdict()));
        order.method = s.method;
        order.resume = s.resume;
        order.envelopes = out.data() + done * s.lanes.lanes;
        order.jumped = jumped.empty() ? nullptr : jumped.data() + done;
        s.run_kernel(order);
        s.resume = false;
        s.watch(rest.part(0, order.count));
        s.position += order.count;
        done += order.count;
    }
}

std::size_t Detector::envelope_stride() const noexcept {
    return state_->lanes.lanes;
}

std::size_t Detector::floor_column(std::size_t i) const noexcept {
    return state_->first_floor() + i;
}

std::size_t Detector::feature_count() const noexcept {
    return state_->features.size();
}

std::size_t Detector::State::skip_blanked(std::size_t frames) noexcept {
    const auto skipped = std::min<std::uint64_t>(frames, blank_until - position);
    if (position < settling_until) {
        settling_until += skipped; // filters that see nothing do not settle
    }
    position += skipped;
    if (position >= blank_until) {
        blank_from = UINT64_MAX;
    }
    resume = true;
    state_gate.splice();
    return static_cast<std::size_t>(skipped);
}

std::size_t Detector::State::advance(const FrameBlock& block, std::optional<Crossing>& crossing) noexcept {
    const auto order = next_order(block);
    const auto result = run_kernel(order);
    resume = false;
    watch(block.part(0, result.frames));
    if (result.last_reference != SIZE_MAX) {
        newest_reference = position + result.last_reference;
    }
    position += result.frames;
    if (order.weight > 0.0) {
        floor_frames += result.frames;
    }
    if (watcher != nullptr) {
        watcher(watcher_context, SampleIndex{position - 1}, {envelope.data(), lanes.signal_lanes + sum_lanes()});
    }
    if (!start.done()) {
        start_floor();
        return result.frames;
    }
    if (decide(result.tally)) {
        crossing = crossing_here(result.tally);
    }
    return result.frames;
}

// As many frames as share one treatment: the floor's weight, and what the kernel waits for.
KernelOrder Detector::State::next_order(const FrameBlock& block) const noexcept {
    KernelOrder order;
    order.frames = block.data.data();
    order.method = method;
    order.resume = resume;
    std::uint64_t limit = std::min<std::uint64_t>(block.frames(), blank_from - position);
    limit = std::min(limit, frames_to_verdict());
    const std::uint64_t still_until = std::max(settling_until, frozen_until);
    const bool still = position < still_until;
    if (still) {
        limit = std::min(limit, still_until - position);
    }
    if (!start.done()) {
        order.count = 1;
        return order;
    }
    if (!still) {
        const bool full = floor_frames >= full_frames;
        order.weight = least_weight;
        order.warming = full ? 0 : floor_frames;
        limit = full ? limit : std::min(limit, full_frames - floor_frames);
    }
    order.count = watcher != nullptr ? 1 : static_cast<std::size_t>(limit);
    order.stop_at_votes = spent ? 0 : votes_needed;
    order.stop_below_rearm = spent ? votes_needed : 0;
    if (above_run > 0) {
        order.count = 1;
    }
    return order;
}

void Detector::State::start_floor() noexcept {
    if (position <= settling_until || !start.take(envelope.data())) {
        return;
    }
    start.read(mean.data(), spread.data());
    floor_frames = start.frames();
}

// True where the crossing is due at the last frame.
bool Detector::State::decide(Tally tally) noexcept {
    if (spent) {
        spent = tally.rearm_votes() >= votes_needed;
        quiet_since = position;
        return false;
    }
    above_run = tally.votes() >= votes_needed ? above_run + 1 : 0;
    if (above_run < min_above) {
        return false;
    }
    above_run = 0;
    spent = true;
    frozen_until = std::max(frozen_until, position + freeze);
    return true;
}

Crossing Detector::State::crossing_here(Tally tally) const noexcept {
    std::size_t site = 0;
    double furthest = -1.0;
    for (std::size_t lane = 0; lane < lanes.lanes; ++lane) {
        const double over = envelope[lane] - (mean[lane] + above[lane] * spread[lane]);
        if (above_adds[lane] == Tally::vote && over > furthest * spread[lane]) {
            site = lane;
            furthest = over / spread[lane];
        }
    }
    Crossing crossing{};
    const std::uint64_t at = position - 1;
    crossing.at = SampleIndex{at};
    crossing.settling = at < settling_until;
    crossing.unsettled = floor_frames < settle_frames;
    crossing.vetoed = newest_reference != UINT64_MAX && at - newest_reference <= veto_window;
    crossing.vetoed = crossing.vetoed || jumped();
    crossing.detail = {static_cast<float>(envelope[site]),
                       static_cast<float>(mean[site]),
                       static_cast<float>(spread[site] * deviation_per_spread),
                       static_cast<float>(mean[site] + above[site] * spread[site]),
                       static_cast<std::uint16_t>(tally.votes()),
                       channel_at(site)};
    return crossing;
}

std::size_t Detector::finite_frames(const FrameBlock& block) const noexcept {
    return millpond::finite_frames(block.data.data(), block.frames(), state_->lanes);
}

void Detector::gap(SampleIndex resumes_at) noexcept {
    auto& s = *state_;
    s.clear_filters();
    s.position = resumes_at.value;
    s.settling_until = s.position + s.filter_settle;
    s.above_run = 0;
    s.site_watch.gap();
    s.state_gate.splice();
    s.resume = true; // the level starts at the first sample: no step into the fresh filter
    if (s.blank_until <= s.position) {
        s.blank_from = UINT64_MAX;
    }
    if (!s.start.done()) {
        s.start.reset();
    }
}

void Detector::blank(SampleIndex from) noexcept {
    auto& s = *state_;
    if (s.blanking == 0) {
        return;
    }
    s.blank_from = std::min(s.blank_from, from.value);
    s.blank_until = std::max(s.blank_until, from.value + s.blanking);
}

void Detector::reset() noexcept {
    auto& s = *state_;
    s.mean.fill(0.0);
    s.spread.fill(0.0);
    s.start.reset();
    s.floor_frames = 0;
    s.frozen_until = 0;
    s.blank_from = UINT64_MAX;
    s.blank_until = 0;
    s.newest_reference = UINT64_MAX;
    s.spent = false;
    s.quiet_since = UINT64_MAX;
    if (s.evidence()) {
        s.site_watch.reset();
        std::fill(s.journaled.begin(), s.journaled.end(), SiteState::alive);
        s.usual_jump.fill(0.0);
        s.lanes.jump.frames = 0;
        s.mix_anew();
    }
    s.mains.reset(s.lanes);
    s.state_gate.reset();
    s.state_changed = false;
    s.gates_open = true;
    for (auto& memory : s.memories) {
        memory.frames = 0;
    }
    gap(SampleIndex{0});
}

void Detector::State::clear_filters() noexcept {
    for (auto* values : {&section_states, &history, &level, &last, &in_phase, &turned, &smooth1, &smooth2, &envelope}) {
        values->fill(0.0);
    }
    lanes.history_at = 0;
    followed.fill(0.0);
    largest_jump.fill(0.0);
}

std::uint16_t Detector::State::channel_at(std::size_t lane) const noexcept {
    return !evidence() && lane < lanes.signal_lanes ? static_cast<std::uint16_t>(channel_of[lane])
                                                    : std::uint16_t{65535};
}

std::size_t Detector::floor_count() const noexcept {
    return state_->lanes.signal_lanes + state_->sum_lanes() - state_->first_floor();
}

FloorDetail Detector::floor(std::size_t i) const noexcept {
    const auto& s = *state_;
    const std::size_t lane = s.first_floor() + i;
    return {s.mean[lane],
            s.spread[lane] * deviation_per_spread,
            static_cast<float>(s.mean[lane] + s.above[lane] * s.spread[lane]),
            s.channel_at(lane),
            static_cast<std::uint16_t>(settled() ? 1 : 0),
            s.floor_frames,
            s.gates_open ? 0U : 1U};
}

bool Detector::settled() const noexcept {
    return state_->start.done() && state_->floor_frames >= state_->settle_frames;
}

std::uint64_t Detector::filter_settle_frames() const noexcept {
    return state_->filter_settle;
}

std::uint64_t Detector::quiet_frames() const noexcept {
    const auto& s = *state_;
    return s.spent ? 0 : s.quiet_since == UINT64_MAX ? UINT64_MAX : s.position - s.quiet_since;
}

bool Detector::settling() const noexcept {
    return state_->position < state_->settling_until;
}

double Detector::filter_delay_samples() const noexcept {
    return state_->filter_delay;
}

double Detector::delay_samples() const noexcept {
    return state_->delay;
}

double Detector::threshold_deviations() const noexcept {
    return state_->settings.threshold.deviations;
}

const BandpassDesign& Detector::bandpass() const noexcept {
    return state_->design;
}

KernelWidth Detector::width() const noexcept {
    return state_->width;
}

void Detector::watch(Watcher watcher, void* context) noexcept {
    state_->watcher = watcher;
    state_->watcher_context = context;
}

} // namespace millpond
