#include "tuning/sweep.hpp"

#include "tuning/job_pool.hpp"
#include "tuning/offline_engine.hpp"
#include "tuning/shared_pass.hpp"

#include <algorithm>
#include <mutex>
#include <utility>

namespace millpond {
namespace {

// Settings that one thread takes through the recordings together: as many as keep a pass cheap beside its rules, few
// enough that two threads have work to the end.
constexpr std::size_t most_in_a_job = 64;

using Places = std::vector<std::size_t>;

// Places of `candidates` without a result, grouped by the pass that they share.
std::vector<Places> jobs_for(std::span<const DetectorSettings> candidates, const SweepResults& known,
                             unsigned threads) {
    std::vector<Places> groups;
    std::size_t left = 0;
    for (std::size_t i = 0; i < candidates.size(); ++i) {
        if (known[i]) {
            continue;
        }
        ++left;
        const auto group = std::find_if(groups.begin(), groups.end(), [&](const Places& places) {
            return share_a_pass(candidates[places.front()], candidates[i]);
        });
        if (group == groups.end()) {
            groups.push_back({i});
        } else {
            group->push_back(i);
        }
    }
    const std::size_t share = std::clamp<std::size_t>((left + threads - 1) / std::max(1U, threads), 1, most_in_a_job);
    std::vector<Places> jobs;
    for (const auto& group : groups) {
        for (std::size_t from = 0; from < group.size(); from += share) {
            const auto to = std::min(from + share, group.size());
            jobs.emplace_back(group.begin() + static_cast<std::ptrdiff_t>(from),
                              group.begin() + static_cast<std::ptrdiff_t>(to));
        }
    }
    return jobs;
}

// A sweep may take hours: what is wrong with its last setting is said before the first one is run.
void refuse_early(std::span<const TuningRecording> recordings, std::span<const DetectorSettings> candidates,
                  const std::vector<Places>& jobs, const SweepPlan& plan) {
    for (const auto& recording : recordings) {
        for (const auto& job : jobs) {
            static_cast<void>(Detector::make(candidates[job.front()], recording.channels, plan.rate));
            for (const auto place : job) {
                check_detector(candidates[place], recording.channels);
            }
        }
    }
}

std::uint64_t block_frames(const SweepPlan& plan) {
    return frames_in_ms(plan.block_s * 1000.0, plan.rate);
}

std::vector<SweepResult> run_job(std::span<const TuningRecording> recordings,
                                 std::span<const DetectorSettings> candidates, const Places& places,
                                 const SweepPlan& plan, const std::atomic<bool>& stop,
                                 std::atomic<std::uint64_t>& seen) {
    std::vector<DetectorSettings> settings;
    for (const auto place : places) {
        settings.push_back(candidates[place]);
    }
    std::vector<JoinedScore> joined(places.size());
    double delay_samples = 0.0;
    for (const auto& recording : recordings) {
        const auto pass = run_shared_pass(settings, recording.channels, plan.rate, recording.data, stop, seen);
        if (pass.found.empty()) {
            return {};
        }
        delay_samples = pass.delay_samples;
        for (std::size_t i = 0; i < joined.size(); ++i) {
            joined[i].add(recording, pass.found[i].detections, pass.found[i].eligible, block_frames(plan));
        }
    }
    std::vector<SweepResult> results;
    for (const auto& each : joined) {
        results.push_back(each.result(plan.early_ms, plan.rate));
        results.back().delay_ms = delay_samples * 1000.0 / plan.rate.value;
    }
    return results;
}

SweepResult run_engine(std::span<const TuningRecording> recordings, const DetectorSettings& detector,
                       const SweepPlan& plan) {
    JoinedScore joined;
    double delay_ms = 0.0;
    for (const auto& recording : recordings) {
        auto engine = OfflineEngine::make({detector, plan.arbiter}, recording.channels, plan.rate);
        engine.start(plan.armed);
        engine.process({SampleIndex{0}, recording.channels.size(), recording.data});
        engine.finish();
        joined.add(recording, detections_to_score(engine.events()), engine.eligible(), block_frames(plan));
        delay_ms = engine.detector().delay_samples() * 1000.0 / plan.rate.value;
    }
    auto result = joined.result(plan.early_ms, plan.rate);
    result.delay_ms = delay_ms;
    return result;
}

// Results on their way from the threads that find them to the thread that asked.
class Collected {
  public:
    Collected(SweepResults known, std::size_t candidates, const SweepWatch& watch)
        : watch_(watch), results_(std::move(known)) {
        results_.resize(candidates);
    }
    [[nodiscard]] const SweepResults& results() const noexcept { return results_; }
    [[nodiscard]] const std::atomic<bool>& stop() const noexcept { return stop_; }

    void put(std::size_t place, const SweepResult& result) {
        const std::lock_guard guard(lock_);
        fresh_.emplace_back(place, result);
    }
    void hand_on(double share) {
        std::vector<std::pair<std::size_t, SweepResult>> fresh;
        {
            const std::lock_guard guard(lock_);
            fresh.swap(fresh_);
        }
        for (const auto& [place, result] : fresh) {
            results_[place] = result;
            watch_.finished(place, result);
        }
        watch_.progress(share);
        stop_ = stop_ || watch_.stop();
    }

  private:
    const SweepWatch& watch_;
    SweepResults results_;
    std::mutex lock_;
    std::vector<std::pair<std::size_t, SweepResult>> fresh_;
    std::atomic<bool> stop_{false};
};

double share_of(std::uint64_t done, std::uint64_t all) noexcept {
    return all == 0 ? 1.0 : static_cast<double>(done) / static_cast<double>(all);
}

} // namespace

SweepResults sweep(std::span<const TuningRecording> recordings, std::span<const DetectorSettings> candidates,
                   const SweepPlan& plan, const SweepWatch& watch, SweepResults known) {
    Collected collected(std::move(known), candidates.size(), watch);
    const auto jobs = jobs_for(candidates, collected.results(), plan.threads);
    refuse_early(recordings, candidates, jobs, plan);
    std::uint64_t frames = 0;
    for (const auto& recording : recordings) {
        frames += recording.frames();
    }
    std::atomic<std::uint64_t> seen{0};
    run_jobs(
        jobs.size(), plan.threads, collected.stop(),
        [&](std::size_t job) {
            const auto found = run_job(recordings, candidates, jobs[job], plan, collected.stop(), seen);
            for (std::size_t i = 0; i < found.size(); ++i) {
                collected.put(jobs[job][i], found[i]);
            }
        },
        [&] { collected.hand_on(share_of(seen, frames * jobs.size())); });
    return collected.results();
}

SweepResults confirm(std::span<const TuningRecording> recordings, std::span<const DetectorSettings> candidates,
                     std::span<const std::size_t> which, const SweepPlan& plan, const SweepWatch& watch,
                     SweepResults known) {
    Collected collected(std::move(known), candidates.size(), watch);
    Places jobs;
    std::copy_if(which.begin(), which.end(), std::back_inserter(jobs),
                 [&](std::size_t place) { return !collected.results()[place]; });
    std::atomic<std::uint64_t> done{0};
    run_jobs(
        jobs.size(), plan.threads, collected.stop(),
        [&](std::size_t job) {
            collected.put(jobs[job], run_engine(recordings, candidates[jobs[job]], plan));
            ++done;
        },
        [&] { collected.hand_on(share_of(done, jobs.size())); });
    return collected.results();
}

} // namespace millpond
