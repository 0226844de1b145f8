#include "tuning/sweep.hpp"

#include "tuning/offline_engine.hpp"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <cmath>
#include <exception>
#include <mutex>
#include <thread>

namespace millpond {
namespace {

// Recordings one after the other on one axis of frames, so that one score covers all of them.
struct Joined {
    Ripples ripples;
    std::vector<SampleIndex> detections;
    Intervals training, held_out;
    std::uint64_t offset = 0;

    void add(const TuningRecording& recording, const OfflineEngine& engine, std::uint64_t block_frames) {
        for (auto ripple : recording.truth) {
            ripple.onset = ripple.onset + offset;
            ripple.peak = ripple.peak + offset;
            ripple.end = ripple.end + offset;
            ripples.push_back(ripple);
        }
        for (const auto at : detections_to_score(engine.events())) {
            detections.push_back(at + offset);
        }
        const auto parts = parts_of(recording.frames(), block_frames);
        const auto eligible = without(engine.eligible(), recording.excluded);
        append(training, intersection(eligible, parts.training));
        append(held_out, intersection(eligible, parts.held_out));
        // A ripple labelled beyond one recording's end must not reach into the next.
        const auto last = ripples.empty() ? SampleIndex{0} : ripples.back().end;
        offset = std::max(offset + recording.frames(), last.value + 1) + block_frames;
    }

  private:
    void append(Intervals& to, const Intervals& from) const {
        for (const auto& interval : from) {
            to.push_back({interval.from + offset, interval.to + offset});
        }
    }
};

SweepResult run_candidate(std::span<const TuningRecording> recordings, const DetectorSettings& detector,
                          const SweepPlan& plan) {
    Joined joined;
    SweepResult result;
    for (const auto& recording : recordings) {
        auto engine = OfflineEngine::make({detector, plan.arbiter}, recording.channels, plan.rate);
        engine.start(true);
        engine.process({SampleIndex{0}, recording.channels.size(), recording.data});
        engine.finish();
        joined.add(recording, engine, frames_in_ms(plan.block_s * 1000.0, plan.rate));
        result.delay_ms = engine.detector().delay_samples() * 1000.0 / plan.rate.value;
    }
    result.training = score(joined.ripples, joined.detections, joined.training, plan.early_ms, plan.rate);
    result.held_out = score(joined.ripples, joined.detections, joined.held_out, plan.early_ms, plan.rate);
    return result;
}

bool at_most(double figure, double limit) noexcept {
    return figure <= limit; // not-a-number is not
}

/// Not-a-number comes last.
double latency_of(const SweepResult& result) noexcept {
    const double median = result.training.onset_latency_ms.median;
    return std::isnan(median) ? INFINITY : median;
}

} // namespace

Parts parts_of(std::uint64_t frames, std::uint64_t block_frames) {
    Parts parts;
    for (std::uint64_t at = 0, block = 0; at < frames; at += block_frames, ++block) {
        auto& side = block % 2 == 0 ? parts.training : parts.held_out;
        side.push_back({SampleIndex{at}, SampleIndex{std::min(at + block_frames, frames)}});
    }
    return parts;
}

std::vector<SweepResult> sweep(std::span<const TuningRecording> recordings,
                               std::span<const DetectorSettings> candidates, const SweepPlan& plan,
                               const std::function<void(std::size_t)>& done) {
    std::vector<SweepResult> results(candidates.size());
    const unsigned threads = std::max(1U, plan.threads);
    std::atomic<std::size_t> next{0}, finished{0};
    std::atomic<unsigned> working{threads};
    std::exception_ptr trouble;
    std::mutex trouble_lock;
    const auto work = [&] {
        for (std::size_t i = next++; i < candidates.size(); i = next++) {
            try {
                results[i] = run_candidate(recordings, candidates[i], plan);
            } catch (...) {
                const std::lock_guard guard(trouble_lock);
                trouble = std::current_exception();
                next = candidates.size();
            }
            ++finished;
        }
        --working;
    };
    {
        std::vector<std::jthread> workers;
        for (unsigned i = 0; i < threads; ++i) {
            workers.emplace_back(work);
        }
        while (working > 0) {
            done(finished);
            std::this_thread::sleep_for(std::chrono::milliseconds(20));
        }
    }
    if (trouble) {
        std::rethrow_exception(trouble);
    }
    done(candidates.size());
    return results;
}

std::vector<std::size_t> ranking(std::span<const SweepResult> results, double max_false_per_minute) {
    std::vector<std::size_t> ranked;
    for (std::size_t i = 0; i < results.size(); ++i) {
        if (at_most(results[i].training.false_per_minute, max_false_per_minute) &&
            results[i].training.eligible_ripples > 0) {
            ranked.push_back(i);
        }
    }
    std::stable_sort(ranked.begin(), ranked.end(), [&](std::size_t a, std::size_t b) {
        const auto& x = results[a].training;
        const auto& y = results[b].training;
        if (x.hit_rate.share != y.hit_rate.share) {
            return x.hit_rate.share > y.hit_rate.share;
        }
        if (latency_of(results[a]) != latency_of(results[b])) {
            return latency_of(results[a]) < latency_of(results[b]);
        }
        return x.false_per_minute < y.false_per_minute;
    });
    return ranked;
}

std::optional<Pick> pick(std::span<const SweepResult> results, double max_false_per_minute) {
    std::size_t passed_over = 0;
    for (const auto index : ranking(results, max_false_per_minute)) {
        if (at_most(results[index].held_out.false_per_minute, max_false_per_minute)) {
            return Pick{index, passed_over};
        }
        ++passed_over;
    }
    return std::nullopt;
}

} // namespace millpond
