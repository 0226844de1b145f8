// The inner loop of a sweep, compiled for three vector widths; all give the same bits. Thread: one.
#include "tuning/floor_batch.hpp"

#include <algorithm>

namespace millpond {
namespace {

#define MILLPOND_VECTORS(WIDTH)                                                                                        \
    struct VectorsOf##WIDTH {                                                                                          \
        static constexpr std::size_t width = WIDTH;                                                                    \
        using Doubles = double __attribute__((vector_size(WIDTH * sizeof(double))));                                   \
        using Words = std::int64_t __attribute__((vector_size(WIDTH * sizeof(std::int64_t))));                         \
    }
MILLPOND_VECTORS(2);
MILLPOND_VECTORS(4);
MILLPOND_VECTORS(8);
#undef MILLPOND_VECTORS

template <class Vector, class Value> [[gnu::always_inline]] inline Vector& at(BatchOf<Value>& batch, std::size_t i) {
    return reinterpret_cast<Vector*>(batch.values.data())[i];
}
template <class Vector, class Value>
[[gnu::always_inline]] inline const Vector& at(const BatchOf<Value>& batch, std::size_t i) {
    return reinterpret_cast<const Vector*>(batch.values.data())[i];
}

// The floor's part of the kernel's compare_to_floor. Weight 0 leaves the floor as it is.
template <class Doubles, class Words>
[[gnu::always_inline]] inline void average(Doubles& mean, Doubles& spread, const Doubles& taken,
                                           const Doubles& weight) {
    const Doubles off = taken - mean;
    // All but the sign: the kernel's magnitude, but for the sign of a zero, which no sum here can tell.
    const Doubles distance = reinterpret_cast<Doubles>(reinterpret_cast<Words>(off) & (INT64_MAX - Words{}));
    mean += weight * off;
    spread += weight * (distance - spread);
}
template <class Doubles, class Words>
[[gnu::always_inline]] inline void take_in(Doubles& mean, Doubles& spread, const Doubles& envelope, const Doubles& clip,
                                           bool clips_below, const Doubles& weight) {
    const Doubles ceiling = mean + clip * spread;
    Doubles taken = envelope < ceiling ? envelope : ceiling;
    if (clips_below) {
        const Doubles bottom = mean - clip * spread;
        taken = taken > bottom ? taken : bottom;
    }
    average<Doubles, Words>(mean, spread, taken, weight);
}

// And its comparison, for one column and settings `i` of the batch.
template <class Doubles, class Words>
[[gnu::always_inline]] inline Words above_floor(ColumnFloor& floor, std::size_t i, double value, const Doubles& clip,
                                                bool clips_below, const Doubles& weight, Words& rearm) {
    const Doubles envelope = value - Doubles{};
    Doubles& mean = at<Doubles>(floor.mean, i);
    Doubles& spread = at<Doubles>(floor.spread, i);
    take_in<Doubles, Words>(mean, spread, envelope, clip, clips_below, weight);
    rearm = envelope > mean + at<Doubles>(floor.rearm, i) * spread;
    return envelope > mean + at<Doubles>(floor.above, i) * spread;
}

// A floor in its first time constant weighs a frame as much as each before it.
template <class Doubles, class Words> [[gnu::always_inline]] inline void next_weight(BatchState& state, std::size_t i) {
    const Words active = at<Words>(state.active, i);
    Doubles& frames = at<Doubles>(state.frames, i);
    const Doubles most = at<Doubles>(state.most_frames, i);
    const Doubles weight = 1.0 / ((frames < most ? frames : most) + 1.0);
    at<Doubles>(state.weight, i) = active != 0 ? weight : Doubles{};
    frames = active != 0 ? frames + 1.0 : frames;
}

template <class Doubles, class Words>
[[gnu::always_inline]] inline Words due_of(BatchState& state, std::size_t i, const double* envelopes,
                                           std::int64_t place) {
    const Doubles clip = at<Doubles>(state.clip, i), weight = at<Doubles>(state.weight, i);
    Words votes{}, rearm_votes{}, rearm{};
    for (auto& column : state.voting) {
        votes -=
            above_floor<Doubles, Words>(column, i, envelopes[column.column], clip, state.clips_below, weight, rearm);
        rearm_votes -= rearm;
    }
    for (auto& column : state.references) {
        const Words above =
            above_floor<Doubles, Words>(column, i, envelopes[column.column], clip, state.clips_below, weight, rearm);
        Words& newest = at<Words>(state.newest_reference, i);
        newest = above != 0 ? place - Words{} : newest;
    }
    at<Words>(state.votes, i) = votes;
    at<Words>(state.rearm_votes, i) = rearm_votes;
    const Words needed = at<Words>(state.needed, i), spent = at<Words>(state.spent, i);
    return (spent & (rearm_votes < needed)) | (~spent & (votes >= needed)) | at<Words>(state.counting, i);
}

template <class Words> [[gnu::always_inline]] inline bool any_of(const Words& mask, std::size_t width) {
    std::int64_t found = 0;
    for (std::size_t i = 0; i < width; ++i) {
        found |= mask[i];
    }
    return found != 0;
}

// Vectors that are worked on in turns, so that the processor need not wait for one frame's sums before the next's.
constexpr std::size_t turns = 2;

// One column over a stride, settings `i` and on: mean and spread stay in registers. `above[f]`: beyond what is waited
// for.
template <class Doubles, class Words>
[[gnu::always_inline]] inline void try_column(ColumnFloor& column, std::size_t i, const double* envelopes,
                                              std::size_t values, const Doubles* clip, bool clips_below,
                                              const Doubles* weight, Words (*above)[turns]) {
    Doubles mean[turns], spread[turns], waited_for[turns];
    for (std::size_t turn = 0; turn < turns; ++turn) {
        mean[turn] = at<Doubles>(column.mean, i + turn);
        spread[turn] = at<Doubles>(column.spread, i + turn);
        waited_for[turn] = at<Doubles>(column.waited_for, i + turn);
    }
    for (std::size_t f = 0; f < stride_frames; ++f) {
        const Doubles envelope = envelopes[f * values + column.column] - Doubles{};
        for (std::size_t turn = 0; turn < turns; ++turn) {
            take_in<Doubles, Words>(mean[turn], spread[turn], envelope, clip[turn], clips_below, weight[turn]);
            above[f][turn] += envelope > mean[turn] + waited_for[turn] * spread[turn];
        }
    }
    for (std::size_t turn = 0; turn < turns; ++turn) {
        at<Doubles>(column.next_mean, i + turn) = mean[turn];
        at<Doubles>(column.next_spread, i + turn) = spread[turn];
    }
}

template <class Doubles, class Words>
[[gnu::always_inline]] inline Words try_settings(BatchState& state, std::size_t i, const double* envelopes,
                                                 std::size_t values) {
    Doubles clip[turns], weight[turns];
    for (std::size_t turn = 0; turn < turns; ++turn) {
        clip[turn] = at<Doubles>(state.clip, i + turn);
        weight[turn] = at<Doubles>(state.weight, i + turn);
    }
    Words votes[stride_frames][turns] = {}, references[stride_frames][turns] = {}, due = {};
    for (auto& column : state.voting) {
        try_column<Doubles, Words>(column, i, envelopes, values, clip, state.clips_below, weight, votes);
    }
    for (auto& column : state.references) {
        try_column<Doubles, Words>(column, i, envelopes, values, clip, state.clips_below, weight, references);
    }
    for (std::size_t turn = 0; turn < turns; ++turn) {
        const Words missing = -at<Words>(state.needed, i + turn), spent = at<Words>(state.spent, i + turn);
        for (std::size_t f = 0; f < stride_frames; ++f) {
            due |= ((votes[f][turn] <= missing) ^ spent) | references[f][turn];
        }
    }
    return due;
}

// True where all envelopes of the column lie within what they are clipped at and below what is waited for, whatever the
// floor does meanwhile: in a frame the mean moves by at most `weight` of its distance from the furthest envelope, the
// spread falls by at most `weight` of itself, so in a stride by less than 8 of those; the other 8 are far more than
// rounding needs.
template <class Doubles, class Words>
[[gnu::always_inline]] inline bool quiet(const ColumnFloor& column, const BatchState& state, double highest,
                                         double lowest) {
    const double furthest = (highest > 0.0 ? highest : 0.0) - (lowest < 0.0 ? lowest : 0.0);
    Words beyond{};
    for (std::size_t i = 0; i < batch_width * sizeof(double) / sizeof(Doubles); ++i) {
        const Doubles mean = at<Doubles>(column.mean, i), spread = at<Doubles>(column.spread, i);
        const Doubles over = at<Doubles>(column.quiet, i) * spread, under = at<Doubles>(state.clip, i) * spread;
        const Doubles size = reinterpret_cast<Doubles>(reinterpret_cast<Words>(mean) & (INT64_MAX - Words{}));
        const Doubles margin = 16.0 * at<Doubles>(state.weight, i) * (size + furthest + under);
        beyond |= ~(highest <= mean + over - margin);
        if (state.clips_below) {
            beyond |= ~(lowest >= mean - under + margin);
        }
    }
    return !any_of(beyond, sizeof(Doubles) / sizeof(double));
}

// The column moves on over a stride of which is known that nothing is clipped and nothing to be decided.
template <class Doubles, class Words>
[[gnu::always_inline]] inline void average_only(ColumnFloor& column, const BatchState& state, const double* envelopes,
                                                std::size_t values) {
    for (std::size_t i = 0; i < batch_width * sizeof(double) / sizeof(Doubles); i += turns) {
        Doubles mean[turns], spread[turns], weight[turns];
        for (std::size_t turn = 0; turn < turns; ++turn) {
            mean[turn] = at<Doubles>(column.mean, i + turn);
            spread[turn] = at<Doubles>(column.spread, i + turn);
            weight[turn] = at<Doubles>(state.weight, i + turn);
        }
        for (std::size_t f = 0; f < stride_frames; ++f) {
            const Doubles envelope = envelopes[f * values + column.column] - Doubles{};
            for (std::size_t turn = 0; turn < turns; ++turn) {
                average<Doubles, Words>(mean[turn], spread[turn], envelope, weight[turn]);
            }
        }
        for (std::size_t turn = 0; turn < turns; ++turn) {
            at<Doubles>(column.mean, i + turn) = mean[turn];
            at<Doubles>(column.spread, i + turn) = spread[turn];
        }
    }
}

template <class Vectors>
[[gnu::always_inline]] inline bool all_quiet(const BatchState& state, const double* highest, const double* lowest) {
    bool all = !state.any_spent;
    for (const auto* columns : {&state.voting, &state.references}) {
        for (const auto& column : *columns) {
            all = all && quiet<typename Vectors::Doubles, typename Vectors::Words>(
                             column, state, highest[column.column], lowest[column.column]);
        }
    }
    return all;
}

// True where a whole stride went by with nothing to decide and no reference above: the floors have moved on.
template <class Vectors>
[[gnu::always_inline]] inline bool quiet_stride(BatchState& state, const EnvelopeBlock& block, std::size_t stride) {
    using Doubles = typename Vectors::Doubles;
    using Words = typename Vectors::Words;
    const std::size_t values = block.values;
    const double* envelopes = block.envelopes + stride * stride_frames * values;
    if (all_quiet<Vectors>(state, block.highest + stride * values, block.lowest + stride * values)) {
        for (auto* columns : {&state.voting, &state.references}) {
            for (auto& column : *columns) {
                average_only<Doubles, Words>(column, state, envelopes, values);
            }
        }
        return true;
    }
    Words due{};
    for (std::size_t i = 0; i < batch_width / Vectors::width; i += turns) {
        due |= try_settings<Doubles, Words>(state, i, envelopes, values);
    }
    if (any_of(due, Vectors::width)) {
        return false;
    }
    for (auto* columns : {&state.voting, &state.references}) {
        for (auto& column : *columns) {
            column.mean = column.next_mean;
            column.spread = column.next_spread;
        }
    }
    return true;
}

template <class Vectors>
[[gnu::always_inline]] inline bool due_at(BatchState& state, const double* envelopes, std::uint64_t place) {
    using Doubles = typename Vectors::Doubles;
    using Words = typename Vectors::Words;
    Words due{};
    for (std::size_t i = 0; i < batch_width / Vectors::width; ++i) {
        if (state.warming) {
            next_weight<Doubles, Words>(state, i);
        }
        due |= due_of<Doubles, Words>(state, i, envelopes, static_cast<std::int64_t>(place));
    }
    return any_of(due, Vectors::width);
}

template <class Vectors>
[[gnu::always_inline]] inline std::size_t walk(BatchState& state, const EnvelopeBlock& block, std::size_t from,
                                               std::size_t to, std::uint64_t place, bool& due) {
    const bool strides = !state.warming && !state.any_counting;
    due = false;
    for (std::size_t frame = from; frame < to && !due;) {
        const std::size_t stride = frame / stride_frames;
        const bool whole = strides && frame % stride_frames == 0 && frame + stride_frames <= to;
        if (whole && quiet_stride<Vectors>(state, block, stride)) {
            frame += stride_frames;
            continue;
        }
        const std::size_t end = std::min((stride + 1) * stride_frames, to);
        for (; frame < end && !due; ++frame) {
            due = due_at<Vectors>(state, block.envelopes + frame * block.values, place + frame);
        }
        if (due || frame == to) {
            return frame - from;
        }
    }
    return to - from;
}

[[gnu::target("avx512f,avx512dq")]] std::size_t walk_avx512(BatchState& state, const EnvelopeBlock& block,
                                                            std::size_t from, std::size_t to, std::uint64_t place,
                                                            bool& due) {
    return walk<VectorsOf8>(state, block, from, to, place, due);
}
[[gnu::target("avx2")]] std::size_t walk_avx2(BatchState& state, const EnvelopeBlock& block, std::size_t from,
                                              std::size_t to, std::uint64_t place, bool& due) {
    return walk<VectorsOf4>(state, block, from, to, place, due);
}
std::size_t walk_sse2(BatchState& state, const EnvelopeBlock& block, std::size_t from, std::size_t to,
                      std::uint64_t place, bool& due) {
    return walk<VectorsOf2>(state, block, from, to, place, due);
}

} // namespace

std::size_t walk_batch(BatchState& state, const EnvelopeBlock& block, std::size_t from, std::size_t to,
                       std::uint64_t place, bool& due) noexcept {
    static const auto widest = __builtin_cpu_supports("avx512f") != 0 && __builtin_cpu_supports("avx512dq") != 0
                                   ? walk_avx512
                               : __builtin_cpu_supports("avx2") != 0 ? walk_avx2
                                                                     : walk_sse2;
    return widest(state, block, from, to, place, due);
}

} // namespace millpond
