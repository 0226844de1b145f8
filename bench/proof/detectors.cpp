#include "proof/detectors.hpp"

#include "tuning/offline_engine.hpp"
#include "tuning/shared_pass.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond::bench {
namespace {

constexpr double all_of_it_s = 1e9; // one block of sweep.hpp: nothing is held out of a training recording

// Thresholds in deviations, each so many times the last.
struct Ladder {
    double first, step;
    std::size_t count;
    [[nodiscard]] double at(std::size_t i) const { return first * std::pow(step, static_cast<double>(i)); }
};
constexpr Ladder textbook_ladder{1.5, 1.05, 66}; // up to 36: bursts of spikes reach far above the floor
constexpr Ladder evidence_ladder{2.2, 1.06, 34}; // up to 15
constexpr Ladder training_ladder{2.5, 1.13, 16}; // up to 16; one batch of the sweep

OfflineEngine ran(const DetectorSettings& settings, const ProofRecording& recording) {
    EngineSettings whole{settings, {}};
    whole.arbiter.condition = Condition::none;
    auto engine = OfflineEngine::make(whole, recording.channels, recording.rate);
    engine.start(true);
    engine.process({SampleIndex{0}, recording.channels.size(), recording.data});
    engine.finish();
    return engine;
}

Counts run_engine(const DetectorSettings& settings, const ProofRecording& recording, const Judged& judged = {}) {
    const auto engine = ran(settings, recording);
    auto eligible = engine.eligible();
    if (judged.block_s > 0.0) {
        const auto block = frames_in_ms(judged.block_s * 1000.0, recording.rate);
        eligible = intersection(eligible, parts_of(recording.frames(), block).held_out);
    }
    return counts_of(recording, detections_to_score(engine.events()), eligible);
}

Curve empty_curve(const Ladder& ladder, std::size_t recordings) {
    Curve curve;
    for (std::size_t i = 0; i < ladder.count; ++i) {
        curve.push_back({ladder.at(i), std::vector<Counts>(recordings)});
    }
    return curve;
}

} // namespace

DetectorSettings with_threshold(DetectorSettings settings, double deviations) {
    settings.threshold.deviations = deviations;
    if (settings.method == DetectionMethod::evidence) {
        // A calibration of two points puts the threshold where it is wanted, whatever else it says.
        settings.evidence.false_per_minute = 1.0;
        settings.evidence.calibration = {{deviations, 1.0}, {deviations + 1.0, 0.5}};
    } else {
        settings.threshold.rearm_deviations = 0.5 * deviations; // common practice
    }
    return settings;
}

std::vector<SampleIndex> detections_of(const DetectorSettings& settings, const ProofRecording& recording) {
    return detections_to_score(ran(settings, recording).events());
}

Curve textbook_curve(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings) {
    auto curve = empty_curve(textbook_ladder, recordings.size());
    std::vector<DetectorSettings> all;
    for (const auto& point : curve) {
        all.push_back(with_threshold(settings, point.threshold));
    }
    in_parallel(recordings.size(), [&](std::size_t i) {
        const auto& recording = recordings[i];
        const std::atomic<bool> never{false};
        std::atomic<std::uint64_t> seen{0};
        const auto pass = run_shared_pass(all, recording.channels, recording.rate, recording.data, never, seen);
        for (std::size_t k = 0; k < curve.size(); ++k) {
            curve[k].by_recording[i] = counts_of(recording, pass.found[k].detections, pass.found[k].eligible);
        }
    });
    return curve;
}

Curve evidence_curve(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings,
                     const Judged& judged) {
    auto curve = empty_curve(evidence_ladder, recordings.size());
    in_parallel(curve.size() * recordings.size(), [&](std::size_t job) {
        auto& point = curve[job / recordings.size()];
        const std::size_t i = job % recordings.size();
        point.by_recording[i] = run_engine(with_threshold(settings, point.threshold), recordings[i], judged);
    });
    return curve;
}

CurvePoint run_as_is(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings) {
    CurvePoint point{0.0, std::vector<Counts>(recordings.size())};
    in_parallel(recordings.size(), [&](std::size_t i) { point.by_recording[i] = run_engine(settings, recordings[i]); });
    point.threshold =
        Detector::make(settings, recordings.front().channels, recordings.front().rate).threshold_deviations();
    return point;
}

DetectorSettings two_bands(double factor, double smoothing_ms) {
    DetectorSettings settings;
    settings.method = DetectionMethod::evidence;
    settings.evidence.features = {{std::string(sites_mix), 150.0, 250.0, 1, smoothing_ms, 1.0},
                                  {std::string(sites_mix), 320.0, 560.0, 1, smoothing_ms, -factor}};
    return settings;
}

DetectorSettings choose_two_bands(const std::vector<ProofRecording>& training) {
    DetectorSettings best;
    double most = -1.0;
    for (const double smoothing_ms : {4.0, 8.0, 12.0}) {
        const auto settings = two_bands(1.5, smoothing_ms);
        double found = 0.0;
        for (const auto& point : evidence_curve(settings, training)) {
            const auto sum = point.sum();
            found = sum.false_per_minute() <= 1.0 ? std::max(found, sum.hit_rate()) : found;
        }
        if (found > most) {
            best = settings;
            most = found;
        }
    }
    return best;
}

Learned learn_ours(const std::vector<ProofRecording>& training, const std::vector<FeatureSettings>& features) {
    return learn_ours_in_blocks(training, features, all_of_it_s);
}

Learned learn_ours_in_blocks(const std::vector<ProofRecording>& training, const std::vector<FeatureSettings>& features,
                             double block_s) {
    LearningPlan plan;
    plan.sweep.rate = training.front().rate;
    plan.sweep.arbiter.condition = Condition::none;
    plan.sweep.block_s = block_s;
    plan.sweep.threads = processors();
    plan.features = features;
    return learn_evidence(for_tuning(training), DetectorSettings{}, plan);
}

namespace {

constexpr double no_veto = 1000.0; // the most that settings may say: nothing is so far out

// One place of the grid, at every training threshold.
std::vector<DetectorSettings> grid_of(Grid grid, bool reference, std::size_t sites) {
    const bool full = grid == Grid::full;
    using Band = std::pair<double, double>;
    const auto bands =
        full ? std::vector<Band>{{130, 250}, {140, 250}, {150, 250}, {150, 220}} : std::vector<Band>{{150, 250}};
    const auto smoothings = full ? std::vector<double>{2, 4, 6, 8, 10, 12} : std::vector<double>{4, 8};
    const auto vetoes = reference ? std::vector<double>{3, 4, 6, no_veto} : std::vector<double>{no_veto};
    auto votes = std::vector<VoteSettings>{{VoteRule::mean, 1}};
    if (sites > 1) {
        votes.push_back({VoteRule::count, 1});
        votes.push_back({VoteRule::count, 2});
    }
    std::vector<DetectorSettings> all;
    for (const auto& [low, high] : bands) {
        for (int order = 1; order <= (full ? 4 : 2); ++order) {
            for (const auto method : {EnvelopeMethod::rectify, EnvelopeMethod::analytic}) {
                for (const double smoothing : smoothings) {
                    for (const auto& vote : votes) {
                        for (const double veto : vetoes) {
                            DetectorSettings settings;
                            settings.filter.low_hz = low;
                            settings.filter.high_hz = high;
                            settings.filter.order = order;
                            settings.envelope = {method, smoothing};
                            settings.vote = vote;
                            settings.veto.deviations = veto;
                            all.push_back(settings);
                        }
                    }
                }
            }
        }
    }
    return all;
}

struct AtRate {
    double found = 0.0, latency_ms = std::numeric_limits<double>::infinity();
};

// Between the two thresholds of the coarse training ladder that lie about the false rate.
AtRate at_rate(std::span<const std::optional<SweepResult>> by_threshold, double false_per_minute) {
    for (std::size_t i = 0; i < by_threshold.size(); ++i) {
        const auto& here = by_threshold[i]->training;
        if (here.false_per_minute > false_per_minute) {
            continue;
        }
        AtRate at{here.hit_rate().share, here.latency_median_ms};
        if (i > 0) {
            const auto& before = by_threshold[i - 1]->training;
            const double share =
                (false_per_minute - here.false_per_minute) / (before.false_per_minute - here.false_per_minute);
            at.found += share * (before.hit_rate().share - at.found);
        }
        return at;
    }
    return {};
}

} // namespace

TextbookChoice choose_textbook(const std::vector<ProofRecording>& training, Grid grid) {
    const auto& channels = training.front().channels;
    const auto count = [&](ChannelRole role) {
        return static_cast<std::size_t>(
            std::count_if(channels.begin(), channels.end(), [&](const auto& channel) { return channel.role == role; }));
    };
    const auto places = grid_of(grid, count(ChannelRole::reference) > 0, count(ChannelRole::ripple));
    std::vector<DetectorSettings> candidates;
    for (const auto& place : places) {
        for (std::size_t i = 0; i < training_ladder.count; ++i) {
            candidates.push_back(with_threshold(place, training_ladder.at(i)));
        }
    }
    SweepPlan plan;
    plan.rate = training.front().rate;
    plan.block_s = all_of_it_s;
    plan.threads = processors();
    const auto recordings = for_tuning(training);
    const auto results = sweep(recordings, candidates, plan);
    const auto figures = [&](std::size_t place, double limit) {
        return at_rate(std::span(results).subspan(place * training_ladder.count, training_ladder.count), limit);
    };
    TextbookChoice choice;
    choice.tried = places.size();
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        for (std::size_t place = 0; place < places.size(); ++place) {
            const auto at = figures(place, asked_false_per_minute[k]);
            if (place == 0 || at.found > choice.best[k].found) {
                choice.best[k] = {places[place], at.found, at.latency_ms};
            }
        }
    }
    choice.quick = choice.best[1];
    for (std::size_t place = 0; place < places.size(); ++place) {
        const auto at = figures(place, 1.0);
        if (at.found >= choice.best[1].found - 0.03 && at.latency_ms < choice.quick.latency_ms) {
            choice.quick = {places[place], at.found, at.latency_ms};
        }
    }
    return choice;
}

std::string BestTextbook::name() const {
    const auto vote = settings.vote.rule == VoteRule::mean ? std::string("mean of sites")
                                                           : fmt::format("{} of sites", settings.vote.sites_needed);
    const auto veto =
        settings.veto.deviations >= no_veto ? std::string("no veto") : fmt::format("veto {}", settings.veto.deviations);
    return fmt::format("{}-{} Hz, order {}, {}, {} ms, {}, {}", settings.filter.low_hz, settings.filter.high_hz,
                       settings.filter.order, word_for<EnvelopeMethod>(envelope_methods, settings.envelope.method),
                       settings.envelope.smoothing_ms, vote, veto);
}

} // namespace millpond::bench
