// Making a detector: all checks, all memory. Thread: control.
#include "base/refusal.hpp"
#include "detector/detector_state.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

KernelWidth widest_here() noexcept {
    if (__builtin_cpu_supports("avx512f") != 0 && __builtin_cpu_supports("avx512dq") != 0) {
        return KernelWidth::avx512;
    }
    return __builtin_cpu_supports("avx2") != 0 ? KernelWidth::avx2 : KernelWidth::sse2;
}

Kernel kernel_of(KernelWidth width, const std::string& where) {
    const bool here = width <= widest_here();
    if (!here) {
        throw Refusal(where, "a vector width that this processor lacks", "automatic, or a narrower one");
    }
    switch (width) {
    case KernelWidth::avx512:
        return run_kernel_avx512;
    case KernelWidth::avx2:
        return run_kernel_avx2;
    default:
        return run_kernel_sse2;
    }
}

KernelEnvelope kernel_method(EnvelopeMethod method) noexcept {
    switch (method) {
    case EnvelopeMethod::rectify:
        return KernelEnvelope::rectify;
    case EnvelopeMethod::energy:
        return KernelEnvelope::energy;
    default:
        return KernelEnvelope::analytic;
    }
}

} // namespace

void check_detector(const DetectorSettings& settings, const Channels& channels, const std::string& where) {
    const auto ripple_sites = std::count_if(channels.begin(), channels.end(),
                                            [](const auto& channel) { return channel.role == ChannelRole::ripple; });
    if (ripple_sites == 0) {
        throw Refusal(where + ": channels", "no channel of role ripple", "at least one");
    }
    if (settings.method == DetectionMethod::evidence) {
        return; // its own settings are checked where they are used
    }
    if (settings.vote.rule == VoteRule::count && settings.vote.sites_needed > ripple_sites) {
        throw Refusal(where + ".vote.sites_needed", std::to_string(settings.vote.sites_needed),
                      "at most the number of ripple sites, " + std::to_string(ripple_sites));
    }
    if (settings.threshold.rearm_deviations > settings.threshold.deviations) {
        throw Refusal(where + ".threshold.rearm_deviations", std::to_string(settings.threshold.rearm_deviations),
                      "at most threshold.deviations, " + std::to_string(settings.threshold.deviations));
    }
}

Detector Detector::make(const DetectorSettings& settings, const Channels& channels, Hertz rate, KernelWidth width,
                        const std::string& where) {
    check_detector(settings, channels, where);
    auto state = std::make_unique<State>();
    state->settings = settings;
    state->rate = rate;
    state->width = width == KernelWidth::automatic ? widest_here() : width;
    state->kernel = kernel_of(state->width, where);
    state->method = kernel_method(settings.envelope.method);
    state->choose_inputs(channels);
    if (state->evidence()) {
        state->choose_features(where + ".evidence");
        state->allocate_own_filters(where + ".evidence");
    } else {
        state->design = design_bandpass(settings.filter, rate, where + ".filter");
        state->choose_lanes();
        state->allocate_filter();
    }
    state->allocate_envelope();
    state->allocate_floor();
    if (state->evidence()) {
        state->allocate_jumps();
        state->allocate_evidence_floor(where + ".evidence");
    } else {
        state->allocate_sites_floor();
    }
    state->count_frames();
    state->mains.prepare(settings.mains, rate, state->lanes, where + ".mains");
    state->state_gate = StateGate::make(settings.state_gate, channels, rate, where + ".state_gate");
    Detector detector(std::move(state));
    detector.reset();
    return detector;
}

void Detector::State::choose_inputs(const Channels& channels) {
    for (std::uint32_t channel = 0; channel < channels.size(); ++channel) {
        if (channels[channel].role != ChannelRole::unused) {
            channel_of.push_back(channel);
            inputs.push_back(channels[channel].role);
        }
    }
    lanes.channels = channels.size();
    lanes.inputs = inputs.size();
    lanes.channel_of = channel_of.data();
}

void Detector::State::choose_lanes() {
    lanes.signal_lanes = inputs.size();
    lanes.in_stream_order = channel_of.back() + 1 == channel_of.size();
    const std::size_t used = lanes.signal_lanes + sum_lanes();
    lanes.lanes = (used + lane_group - 1) / lane_group * lane_group;
    channel_of.resize(lanes.lanes);
    lanes.channel_of = channel_of.data();
    lane_used = Lanes<std::uint64_t>(lanes.lanes);
    for (std::size_t lane = 0; lane < lanes.signal_lanes; ++lane) {
        lane_used[lane] = UINT64_MAX;
    }
    lanes.lane_used = lane_used.data();
}

void Detector::State::allocate_filter() {
    lanes.sections = design.sections.size();
    coefficients = Lanes<double>(lanes.sections * 5);
    for (std::size_t i = 0; i < lanes.sections; ++i) {
        const auto& section = design.sections[i];
        const double row[5] = {section.b0, section.b1, section.b2, section.a1, section.a2};
        std::copy(std::begin(row), std::end(row), coefficients.data() + 5 * i);
    }
    section_states = Lanes<double>(lanes.lanes * lanes.sections * 2);
    lanes.taps = design.taps.size();
    tap_values = Lanes<double>(lanes.taps);
    std::copy(design.taps.begin(), design.taps.end(), tap_values.data());
    history = Lanes<double>(2 * lanes.taps * lanes.lanes);
    lanes.coefficients = coefficients.data();
    lanes.section_states = section_states.data();
    lanes.tap_values = tap_values.data();
    lanes.history = history.data();
}

void Detector::State::allocate_envelope() {
    const auto lane_array = [&](Lanes<double>& values) {
        values = Lanes<double>(lanes.lanes);
        return values.data();
    };
    lanes.level = lane_array(level);
    lanes.last = lane_array(last);
    lanes.in_phase = lane_array(in_phase);
    lanes.turned = lane_array(turned);
    lanes.smooth1 = lane_array(smooth1);
    lanes.smooth2 = lane_array(smooth2);
    lanes.envelope = lane_array(envelope);
    const double section_delay_frames = settings.envelope.smoothing_ms * rate.value / 1000.0 / 2.0;
    lanes.quadrature = quadrature_at(band_centre(settings.filter), rate);
    lanes.smoothing = 1.0 / (1.0 + section_delay_frames);
}

void Detector::State::allocate_floor() {
    for (auto* values : {&mean, &spread, &above, &rearm, &sum_weight}) {
        *values = Lanes<double>(lanes.lanes);
    }
    for (auto& memory : memories) {
        memory.mean = Lanes<double>(lanes.lanes);
        memory.spread = Lanes<double>(lanes.lanes);
    }
    above_adds = Lanes<std::uint64_t>(lanes.lanes);
    rearm_adds = Lanes<std::uint64_t>(lanes.lanes);
    lanes.mean = mean.data();
    lanes.spread = spread.data();
    lanes.clip = settings.floor.clip_deviations * deviation_per_spread;
    lanes.above = above.data();
    lanes.rearm = rearm.data();
    lanes.above_adds = above_adds.data();
    lanes.rearm_adds = rearm_adds.data();
    lanes.sum_weight = sum_lanes() > 0 ? sum_weight.data() : nullptr;
}

void Detector::State::vote_of(std::size_t lane) const {
    above[lane] = settings.threshold.deviations * deviation_per_spread;
    rearm[lane] = settings.threshold.rearm_deviations * deviation_per_spread;
    above_adds[lane] = Tally::vote;
    rearm_adds[lane] = Tally::vote_rearm;
}

void Detector::State::allocate_sites_floor() {
    const bool by_mean = settings.vote.rule == VoteRule::mean;
    const auto ripple_sites = static_cast<double>(std::count(inputs.begin(), inputs.end(), ChannelRole::ripple));
    for (std::size_t lane = 0; lane < lanes.signal_lanes; ++lane) {
        if (inputs[lane] == ChannelRole::reference) {
            above[lane] = settings.veto.deviations * deviation_per_spread;
            above_adds[lane] = Tally::reference;
            continue;
        }
        vote_of(lane);
        sum_weight[lane] = 1.0 / ripple_sites;
        if (by_mean) {
            above_adds[lane] = rearm_adds[lane] = 0; // its threshold stays, for the journal's floors
        }
    }
    if (by_mean) {
        vote_of(lanes.signal_lanes);
    }
    votes_needed = by_mean ? 1 : static_cast<std::uint32_t>(settings.vote.sites_needed);
}

void Detector::State::count_frames() {
    const auto frames = [&](double ms) { return frames_in_ms(ms, rate); };
    settle_frames = frames(settings.floor.settle_s * 1000.0);
    full_frames = std::max<std::uint64_t>(frames(settings.floor.time_constant_s * 1000.0), 1);
    least_weight = 1.0 / (static_cast<double>(full_frames) + 1.0);
    start = FloorStart::make(lanes.lanes, std::min(frames(1000.0), std::max<std::uint64_t>(settle_frames / 2, 1)));
    freeze = frames(settings.floor.freeze_ms);
    min_above = std::max<std::uint64_t>(frames(settings.threshold.min_above_ms), 1);
    blanking = frames(settings.blanking_ms);
    veto_window = frames(settings.veto.window_ms);
    // The smoother's energy is down to a ten-thousandth after five times its delay.
    if (!evidence()) {
        filter_delay = design.group_delay_samples(band_centre(settings.filter), rate);
        delay = filter_delay + settings.envelope.smoothing_ms * rate.value / 1000.0;
        filter_settle = design.settle_samples() + frames(5.0 * settings.envelope.smoothing_ms);
    }
}

void Detector::warm_start(const std::vector<FloorState>& floors) {
    auto& s = *state_;
    if (floors.size() != floor_count()) {
        throw Refusal("detector.floor.warm_start_session", std::to_string(floors.size()) + " floors",
                      "as many as this session has, " + std::to_string(floor_count()));
    }
    for (std::size_t i = 0; i < floors.size(); ++i) {
        s.mean[s.first_floor() + i] = floors[i].mean;
        s.spread[s.first_floor() + i] = floors[i].deviation / deviation_per_spread;
    }
    s.floor_frames = floors.front().frames;
    s.start.skip();
}

} // namespace millpond
