// The inner loop of a sweep, compiled for three vector widths; all give the same bits. Thread: one.
#include "tuning/floor_batch.hpp"

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

// The kernel's compare_to_floor, for one column and settings `i` of the batch. Weight 0 leaves the floor as it is.
template <class Doubles, class Words>
[[gnu::always_inline]] inline Words above_floor(ColumnFloor& floor, std::size_t i, double value, const Doubles& clip,
                                                const Doubles& weight, Words& rearm) {
    const Doubles envelope = value - Doubles{};
    Doubles& mean = at<Doubles>(floor.mean, i);
    Doubles& spread = at<Doubles>(floor.spread, i);
    const Doubles ceiling = mean + clip * spread;
    const Doubles taken = envelope < ceiling ? envelope : ceiling;
    const Doubles off = taken - mean;
    mean += weight * off;
    spread += weight * ((off < 0.0 ? -off : off) - spread);
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
        votes -= above_floor<Doubles, Words>(column, i, envelopes[column.column], clip, weight, rearm);
        rearm_votes -= rearm;
    }
    for (auto& column : state.references) {
        const Words above = above_floor<Doubles, Words>(column, i, envelopes[column.column], clip, weight, rearm);
        Words& newest = at<Words>(state.newest_reference, i);
        newest = above != 0 ? place - Words{} : newest;
    }
    at<Words>(state.votes, i) = votes;
    at<Words>(state.rearm_votes, i) = rearm_votes;
    const Words needed = at<Words>(state.needed, i), spent = at<Words>(state.spent, i);
    return (spent & (rearm_votes < needed)) | (~spent & (votes >= needed)) | at<Words>(state.counting, i);
}

template <class Vectors>
[[gnu::always_inline]] inline std::size_t walk(BatchState& state, const double* envelopes, std::size_t values,
                                               std::size_t count, std::uint64_t first, bool& due) {
    using Doubles = typename Vectors::Doubles;
    using Words = typename Vectors::Words;
    constexpr std::size_t width = Vectors::width, vectors = batch_width / width;
    for (std::size_t frame = 0; frame < count; ++frame, envelopes += values) {
        Words any{};
        for (std::size_t i = 0; i < vectors; ++i) {
            if (state.warming) {
                next_weight<Doubles, Words>(state, i);
            }
            any |= due_of<Doubles, Words>(state, i, envelopes, static_cast<std::int64_t>(first + frame));
        }
        std::int64_t found = 0;
        for (std::size_t i = 0; i < width; ++i) {
            found |= any[i];
        }
        if (found != 0) {
            due = true;
            return frame + 1;
        }
    }
    due = false;
    return count;
}

[[gnu::target("avx512f,avx512dq")]] std::size_t walk_avx512(BatchState& state, const double* envelopes,
                                                            std::size_t values, std::size_t count, std::uint64_t first,
                                                            bool& due) {
    return walk<VectorsOf8>(state, envelopes, values, count, first, due);
}
[[gnu::target("avx2")]] std::size_t walk_avx2(BatchState& state, const double* envelopes, std::size_t values,
                                              std::size_t count, std::uint64_t first, bool& due) {
    return walk<VectorsOf4>(state, envelopes, values, count, first, due);
}
std::size_t walk_sse2(BatchState& state, const double* envelopes, std::size_t values, std::size_t count,
                      std::uint64_t first, bool& due) {
    return walk<VectorsOf2>(state, envelopes, values, count, first, due);
}

} // namespace

std::size_t walk_batch(BatchState& state, const double* envelopes, std::size_t values, std::size_t count,
                       std::uint64_t first, bool& due) noexcept {
    static const auto widest = __builtin_cpu_supports("avx512f") != 0 && __builtin_cpu_supports("avx512dq") != 0
                                   ? walk_avx512
                               : __builtin_cpu_supports("avx2") != 0 ? walk_avx2
                                                                     : walk_sse2;
    return widest(state, envelopes, values, count, first, due);
}

} // namespace millpond
