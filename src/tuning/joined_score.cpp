#include "tuning/joined_score.hpp"

#include <algorithm>

namespace millpond {

Parts parts_of(std::uint64_t frames, std::uint64_t block_frames) {
    Parts parts;
    for (std::uint64_t at = 0, block = 0; at < frames; at += block_frames, ++block) {
        auto& side = block % 2 == 0 ? parts.training : parts.held_out;
        side.push_back({SampleIndex{at}, SampleIndex{std::min(at + block_frames, frames)}});
    }
    return parts;
}

void JoinedScore::add(const TuningRecording& recording, const std::vector<SampleIndex>& detections,
                      const Intervals& eligible, std::uint64_t block_frames) {
    for (auto ripple : recording.truth) {
        ripple.onset = ripple.onset + offset_;
        ripple.peak = ripple.peak + offset_;
        ripple.end = ripple.end + offset_;
        ripples_.push_back(ripple);
    }
    for (const auto at : detections) {
        detections_.push_back(at + offset_);
    }
    const auto parts = parts_of(recording.frames(), block_frames);
    const auto judged = without(eligible, recording.excluded);
    append(training_, intersection(judged, parts.training));
    append(held_out_, intersection(judged, parts.held_out));
    // A ripple labelled beyond one recording's end must not reach into the next.
    const auto last = ripples_.empty() ? SampleIndex{0} : ripples_.back().end;
    offset_ = std::max(offset_ + recording.frames(), last.value + 1) + block_frames;
}

SweepResult JoinedScore::result(double early_ms, Hertz rate) const {
    const auto part = [&](const Intervals& eligible) {
        return figures_of(score(ripples_, detections_, eligible, early_ms, rate), frames_in(eligible));
    };
    return {part(training_), part(held_out_), 0.0};
}

void JoinedScore::append(Intervals& to, const Intervals& from) const {
    for (const auto& interval : from) {
        to.push_back({interval.from + offset_, interval.to + offset_});
    }
}

} // namespace millpond
