// The text of the kernel, compiled once for each vector width by the three files beside this one.
// Before including it: MILLPOND_LANES (doubles in a vector), MILLPOND_SQRT(v), MILLPOND_KERNEL (the function's name).
// Nothing here may call a function of the standard library: it would be compiled for this width and could replace
// the common copy in the linked program.

namespace millpond {
namespace {

using Doubles = double __attribute__((vector_size(MILLPOND_LANES * sizeof(double))));
using Floats = float __attribute__((vector_size(MILLPOND_LANES * sizeof(float))));
using Words = std::int64_t __attribute__((vector_size(MILLPOND_LANES * sizeof(std::int64_t))));
constexpr std::size_t width = MILLPOND_LANES;
constexpr std::size_t vectors_in_group = lane_group / width;

// NOLINTNEXTLINE(readability-non-const-parameter): what it returns is written to.
inline Doubles& at(double* values, std::size_t lane) {
    return *reinterpret_cast<Doubles*>(values + lane);
}
inline const Doubles& at(const double* values, std::size_t lane) {
    return *reinterpret_cast<const Doubles*>(values + lane);
}
inline const Words& at(const std::uint64_t* values, std::size_t lane) {
    return *reinterpret_cast<const Words*>(values + lane);
}
inline Doubles magnitude(Doubles value) {
    return value < 0.0 ? -value : value;
}

// A whole vector straight from the frame where all of it is memory that may be read; what lies beyond the looked-at
// channels is masked away. Else value by value: at the end of a block, and where roles leave gaps between channels.
inline Doubles raw_lanes(const KernelState& state, const float* frame, std::size_t lane, bool whole_vectors) {
    Floats raw;
    if (whole_vectors) {
        __builtin_memcpy(&raw, frame + lane, sizeof raw);
    } else {
        for (std::size_t i = 0; i < width; ++i) {
            raw[i] = frame[state.channel_of[lane + i]];
        }
    }
    const Doubles value = __builtin_convertvector(raw, Doubles);
    return reinterpret_cast<Doubles>(reinterpret_cast<Words>(value) & at(state.lane_used, lane));
}

// Channel after channel, so that the sum has the same bits at every width.
inline Doubles mixed_lanes(const KernelState& state, const float* frame, std::size_t lane) {
    Doubles sum = {};
    for (std::size_t i = 0; i < state.inputs; ++i) {
        sum += static_cast<double>(frame[state.channel_of[i]]) * at(state.mix + i * state.lanes, lane);
    }
    return sum;
}

// As filter_sections, each lane with coefficients of its own.
inline Doubles filter_own_sections(KernelState& state, std::size_t lane, Doubles value) {
    const std::size_t group = lane / lane_group;
    double* states = state.section_states + group * state.sections * 2 * lane_group + lane % lane_group;
    const double* c = state.coefficients + lane;
    for (std::size_t i = 0; i < state.sections; ++i, states += 2 * lane_group, c += 5 * state.lanes) {
        Doubles& first = at(states, 0);
        Doubles& second = at(states, lane_group);
        const Doubles out = at(c, 0) * value + first;
        first = (at(c, state.lanes) * value + second) - at(c, 3 * state.lanes) * out;
        second = at(c, 2 * state.lanes) * value - at(c, 4 * state.lanes) * out;
        value = out;
    }
    return value;
}

inline Doubles filter_sections(KernelState& state, std::size_t lane, Doubles value) {
    const std::size_t group = lane / lane_group;
    double* states = state.section_states + group * state.sections * 2 * lane_group + lane % lane_group;
    const double* c = state.coefficients;
    for (std::size_t i = 0; i < state.sections; ++i, states += 2 * lane_group, c += 5) {
        Doubles& first = at(states, 0);
        Doubles& second = at(states, lane_group);
        const Doubles out = c[0] * value + first;
        first = (c[1] * value + second) - c[3] * out;
        second = c[2] * value - c[4] * out;
        value = out;
    }
    return value;
}

inline Doubles filter_taps(KernelState& state, std::size_t lane, Doubles value) {
    at(state.history + state.history_at * state.lanes, lane) = value;
    at(state.history + (state.history_at + state.taps) * state.lanes, lane) = value;
    const double* newest = state.history + (state.history_at + state.taps) * state.lanes;
    Doubles sum = state.tap_values[0] * value;
    for (std::size_t i = 1; i < state.taps; ++i) {
        sum += state.tap_values[i] * at(newest - i * state.lanes, lane);
    }
    return sum;
}

// The analytic magnitude needs the band signal turned by 90 degrees: a first-order all-pass does so at the centre.
template <class Coefficient>
inline Doubles energy_with_turned(KernelState& state, std::size_t lane, Doubles band, Coefficient quadrature) {
    Doubles& before = at(state.in_phase, lane);
    Doubles& turned = at(state.turned, lane);
    turned = quadrature * (band - turned) + before;
    before = band;
    return band * band + turned * turned;
}

template <KernelEnvelope method> inline Doubles envelope_of(KernelState& state, std::size_t lane, Doubles band) {
    Doubles size;
    if constexpr (method == KernelEnvelope::rectify) {
        size = magnitude(band);
    } else if constexpr (method == KernelEnvelope::energy) {
        size = band * band;
    } else {
        size = MILLPOND_SQRT(energy_with_turned(state, lane, band, state.quadrature));
    }
    Doubles& first = at(state.smooth1, lane);
    Doubles& second = at(state.smooth2, lane);
    first += state.smoothing * (size - first);
    second += state.smoothing * (first - second);
    if constexpr (method == KernelEnvelope::energy) {
        return MILLPOND_SQRT(second);
    } else {
        return second;
    }
}

inline Doubles own_envelope_of(KernelState& state, std::size_t lane, Doubles band) {
    const Doubles size = MILLPOND_SQRT(energy_with_turned(state, lane, band, at(state.quadratures, lane)));
    const Doubles smoothing = at(state.smoothings, lane);
    Doubles& first = at(state.smooth1, lane);
    Doubles& second = at(state.smooth2, lane);
    first += smoothing * (size - first);
    second += smoothing * (first - second);
    return second;
}

// Eight partial sums whatever the width, then one fixed order: the sum has the same bits at every width.
inline double sum_over_lanes(const KernelState& state) {
    Doubles sums[vectors_in_group] = {};
    for (std::size_t lane = 0; lane < state.lanes; lane += lane_group) {
        for (std::size_t v = 0; v < vectors_in_group; ++v) {
            sums[v] += at(state.sum_weight, lane + v * width) * at(state.envelope, lane + v * width);
        }
    }
    alignas(64) double part[lane_group];
    for (std::size_t v = 0; v < vectors_in_group; ++v) {
        at(part, v * width) = sums[v];
    }
    return ((part[0] + part[4]) + (part[2] + part[6])) + ((part[1] + part[5]) + (part[3] + part[7]));
}

// Evidence can fall as far as it can rise, so there the floor is clipped on both sides.
template <bool mixed> inline Tally compare_to_floor(KernelState& state, double weight) {
    Words tally = {};
    for (std::size_t lane = 0; lane < state.lanes; lane += width) {
        const Doubles envelope = at(state.envelope, lane);
        Doubles& mean = at(state.mean, lane);
        Doubles& spread = at(state.spread, lane);
        if (weight > 0.0) {
            const Doubles ceiling = mean + state.clip * spread;
            Doubles taken = envelope < ceiling ? envelope : ceiling;
            if constexpr (mixed) {
                const Doubles bottom = mean - state.clip * spread;
                taken = taken > bottom ? taken : bottom;
            }
            const Doubles off = taken - mean;
            mean += weight * off;
            spread += weight * (magnitude(off) - spread);
        }
        const Words above = envelope > mean + at(state.above, lane) * spread;
        const Words rearm = envelope > mean + at(state.rearm, lane) * spread;
        tally += (above & at(state.above_adds, lane)) + (rearm & at(state.rearm_adds, lane));
    }
    std::uint64_t sum = 0;
    for (std::size_t i = 0; i < width; ++i) {
        sum += static_cast<std::uint64_t>(tally[i]);
    }
    return Tally{sum};
}

// An envelope of twice its usual size is an event, not hum.
constexpr double far_above_calm = 2.0, most_of_calm = 4.0;

// The hum that the lane has learned, as it is now.
inline Doubles hum_now(const KernelState& state, std::size_t lane) {
    const auto& hum = state.hum;
    Doubles sum = {};
    for (std::size_t h = 0; h < hum.harmonics; ++h) {
        sum += hum.cosine[h] * at(hum.in_phase + h * state.lanes, lane) +
               hum.sine[h] * at(hum.quadrature + h * state.lanes, lane);
    }
    return sum;
}

// Learns hum from what was left without it.
inline void learn_hum(KernelState& state, std::size_t lane, Doubles left, double calm_weight) {
    auto& hum = state.hum;
    const Doubles envelope = at(state.envelope, lane);
    Doubles& calm = at(hum.calm, lane);
    const bool warming = hum.calm_frames < hum.calm_needed;
    const Doubles most = most_of_calm * calm;
    const Doubles taken = warming ? envelope : envelope < most ? envelope : most;
    calm += calm_weight * (taken - calm);
    const Doubles nothing = {};
    const Doubles lesson = warming ? left : envelope <= far_above_calm * calm ? left : nothing;
    const Doubles step = hum.gain * lesson;
    for (std::size_t h = 0; h < hum.harmonics; ++h) {
        at(hum.in_phase + h * state.lanes, lane) += step * hum.cosine[h];
        at(hum.quadrature + h * state.lanes, lane) += step * hum.sine[h];
    }
}

// Beyond ten times the usual a distance enters the usual as that much, and a little more, so that a channel which was
// flat finds back.
inline void watch_for_jumps(KernelState& state, std::size_t lane, Doubles signal, double weight) {
    auto& jump = state.jump;
    Doubles& followed = at(jump.followed, lane);
    Doubles& largest = at(jump.largest, lane);
    Doubles& usual = at(jump.usual, lane);
    const Doubles distance = magnitude(signal - followed);
    followed += jump.follow * (signal - followed);
    const Doubles faded = jump.fade * largest;
    largest = distance > faded ? distance : faded;
    const Doubles most = 10.0 * usual + 0.001;
    const Doubles clipped = distance < most ? distance : most;
    const Doubles taken = jump.frames < jump.full_frames ? distance : clipped;
    usual += weight * (taken - usual);
}

inline void turn_oscillators(KernelHum& hum) {
    for (std::size_t i = 0; i < hum.oscillators; i += width) {
        Doubles& cosine = at(hum.cosine, i);
        Doubles& sine = at(hum.sine, i);
        const Doubles before = cosine;
        cosine = before * at(hum.turn_cosine, i) - sine * at(hum.turn_sine, i);
        sine = sine * at(hum.turn_cosine, i) + before * at(hum.turn_sine, i);
    }
}

template <KernelEnvelope method, bool mixed, bool hum>
inline void envelopes_of_frame(KernelState& state, const float* frame, bool whole_vectors, bool resume) {
    double calm_weight = 0.0;
    if constexpr (hum) {
        calm_weight = state.hum.calm_frames < state.hum.calm_needed
                          ? 1.0 / (static_cast<double>(state.hum.calm_frames) + 1.0)
                          : state.hum.calm_weight;
    }
    double jump_weight = 0.0;
    if constexpr (mixed) {
        jump_weight = state.jump.frames < state.jump.full_frames ? 1.0 / (static_cast<double>(state.jump.frames) + 1.0)
                                                                 : state.jump.weight;
    }
    for (std::size_t lane = 0; lane < state.lanes; lane += width) {
        Doubles raw;
        if constexpr (mixed) {
            raw = mixed_lanes(state, frame, lane);
        } else {
            raw = raw_lanes(state, frame, lane, whole_vectors);
        }
        Doubles& level = at(state.level, lane);
        Doubles& last = at(state.last, lane);
        if constexpr (hum) {
            raw -=
                hum_now(state, lane); // before the splice: hum goes on through it, and must not be held with the rest
        }
        if (resume) {
            level = raw - last;
        }
        const Doubles signal = last = raw - level;
        if constexpr (hum) {
            level += state.hum.level_follow * signal; // or splices would add up to an offset that is learned as hum
            learn_hum(state, lane, signal, calm_weight);
        }
        if constexpr (mixed) {
            watch_for_jumps(state, lane, signal, jump_weight);
            at(state.envelope, lane) = own_envelope_of(state, lane, filter_own_sections(state, lane, signal));
        } else {
            const Doubles band =
                state.taps == 0 ? filter_sections(state, lane, signal) : filter_taps(state, lane, signal);
            at(state.envelope, lane) = envelope_of<method>(state, lane, band);
        }
    }
    if constexpr (hum) {
        turn_oscillators(state.hum);
        ++state.hum.calm_frames;
    }
    if constexpr (mixed) {
        ++state.jump.frames;
    }
    if (state.taps != 0) {
        state.history_at = state.history_at + 1 == state.taps ? 0 : state.history_at + 1;
    }
}

template <KernelEnvelope method, bool mixed, bool hum>
inline void envelope_of_every_lane(KernelState& state, const KernelOrder& order, std::size_t frame_of_order,
                                   const float* frame, bool resume) {
    const bool whole_vectors = state.in_stream_order && (order.count - frame_of_order) * state.channels >= state.lanes;
    envelopes_of_frame<method, mixed, hum>(state, frame, whole_vectors, resume);
    if (state.sum_weight != nullptr) {
        state.envelope[state.signal_lanes] = sum_over_lanes(state);
    }
}

// For sweeps: what the loop below would compare, written out instead.
template <KernelEnvelope method, bool mixed, bool hum>
inline KernelResult keep_envelopes(KernelState& state, const KernelOrder& order) {
    KernelResult result;
    double* kept = order.envelopes;
    for (const float* frame = order.frames; result.frames < order.count; frame += state.channels) {
        envelope_of_every_lane<method, mixed, hum>(state, order, result.frames, frame,
                                                   order.resume && result.frames == 0);
        for (std::size_t lane = 0; lane < state.lanes; lane += width) {
            __builtin_memcpy(kept + lane, state.envelope + lane, sizeof(Doubles)); // the caller's memory lies anywhere
        }
        if (order.jumped != nullptr) {
            order.jumped[result.frames] = mixed && jumped(state.jump) ? 1 : 0;
        }
        kept += state.lanes;
        ++result.frames;
    }
    return result;
}

template <KernelEnvelope method, bool mixed, bool hum>
inline KernelResult run_method(KernelState& state, const KernelOrder& order) {
    if (order.envelopes != nullptr) {
        return keep_envelopes<method, mixed, hum>(state, order);
    }
    KernelResult result;
    for (const float* frame = order.frames; result.frames < order.count; frame += state.channels) {
        envelope_of_every_lane<method, mixed, hum>(state, order, result.frames, frame,
                                                   order.resume && result.frames == 0);
        const double weight =
            order.warming == 0 ? order.weight : 1.0 / static_cast<double>(order.warming + result.frames + 1);
        result.tally = compare_to_floor<mixed>(state, weight);
        if (result.tally.references() != 0) {
            result.last_reference = result.frames;
        }
        ++result.frames;
        if ((order.stop_at_votes != 0 && result.tally.votes() >= order.stop_at_votes) ||
            result.tally.rearm_votes() < order.stop_below_rearm) {
            break;
        }
    }
    return result;
}

// Apart for each case, so that what is off costs nothing.
template <bool hum> inline KernelResult run_chosen(KernelState& state, const KernelOrder& order) {
    if (state.mix != nullptr) {
        return run_method<KernelEnvelope::analytic, true, hum>(state, order);
    }
    switch (order.method) {
    case KernelEnvelope::rectify:
        return run_method<KernelEnvelope::rectify, false, hum>(state, order);
    case KernelEnvelope::energy:
        return run_method<KernelEnvelope::energy, false, hum>(state, order);
    default:
        return run_method<KernelEnvelope::analytic, false, hum>(state, order);
    }
}

} // namespace

KernelResult MILLPOND_KERNEL(KernelState& state, const KernelOrder& order) noexcept {
    return state.hum.harmonics > 0 ? run_chosen<true>(state, order) : run_chosen<false>(state, order);
}

} // namespace millpond
