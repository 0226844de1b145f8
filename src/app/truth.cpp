#include "app/truth.hpp"

#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "synth/scene_element.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

SampleIndex frame_at(double seconds, Hertz rate) {
    return SampleIndex{static_cast<std::uint64_t>(std::llround(std::max(0.0, seconds * rate.value)))};
}

/// A row that `synth` writes of what is no ripple: an invented recording may hold nothing else.
bool stands_beside_ripples(const TableEvent& event) {
    return std::any_of(std::begin(happening_kinds), std::end(happening_kinds),
                       [&](const auto& kind) { return kind.word == event.trial_type; });
}

} // namespace

Ripples ripples_from_table(const std::filesystem::path& table, Hertz rate, std::uint64_t frames) {
    const auto events = read_events_table(table, rate.value);
    Ripples ripples;
    for (const auto& event : events) {
        const double end_s = event.onset_s + event.duration_s;
        if (event.trial_type != "ripple" || end_s < 0.0) {
            continue; // what ended before the first sample is not in the recording
        }
        const Ripple ripple{frame_at(event.onset_s, rate), frame_at((event.onset_s + end_s) / 2.0, rate),
                            frame_at(end_s, rate), 0.0};
        if (ripple.onset.value >= frames) {
            throw Refusal(
                table.string(), fmt::format("a ripple at {:.3f} s", event.onset_s),
                fmt::format("onsets within the recording's {:.3f} s", static_cast<double>(frames) / rate.value));
        }
        ripples.push_back(ripple);
    }
    const bool invented = std::all_of(events.begin(), events.end(), stands_beside_ripples);
    if (ripples.empty() && !invented) {
        throw Refusal(table.string(), fmt::format("{} rows, none of trial_type ripple", events.size()),
                      "ripples, or a table without rows where there are none");
    }
    std::stable_sort(ripples.begin(), ripples.end(),
                     [](const Ripple& a, const Ripple& b) { return a.onset < b.onset; });
    return ripples;
}

} // namespace millpond
