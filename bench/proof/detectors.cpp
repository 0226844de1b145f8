#include "proof/detectors.hpp"

#include "tuning/offline_engine.hpp"
#include "tuning/shared_pass.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <set>

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
constexpr Ladder evidence_ladder{2.0, 1.05, 48}; // up to 20
constexpr Ladder training_ladder{2.5, 1.13, 16}; // up to 16; one batch of the sweep

OfflineEngine ran(const DetectorSettings& settings, const ProofRecording& recording) {
    auto engine = OfflineEngine::make({settings, {}}, recording.channels, recording.rate);
    engine.start(false); // not armed: no triggers, so nothing is blanked
    engine.process({SampleIndex{0}, recording.channels.size(), recording.data});
    engine.finish();
    return engine;
}

Intervals judged_part(const Intervals& eligible, const ProofRecording& recording, const Judged& judged) {
    if (judged.block_s == 0.0) {
        return eligible;
    }
    const auto block = frames_in_ms(judged.block_s * 1000.0, recording.rate);
    return intersection(eligible, parts_of(recording.frames(), block).held_out);
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

namespace {

Counts judged_counts(const ProofRecording& recording, std::span<const SampleIndex> detections,
                     const Intervals& eligible, const Judged& judged) {
    return counts_of(recording, detections, judged_part(eligible, recording, judged));
}

void run_thresholds_together(Curve& curve, const std::vector<DetectorSettings>& all,
                             const std::vector<ProofRecording>& recordings, const Judged& judged) {
    in_parallel(recordings.size(), [&](std::size_t i) {
        const auto& recording = recordings[i];
        const std::atomic<bool> never{false};
        std::atomic<std::uint64_t> seen{0};
        const auto pass = run_shared_pass(all, recording.channels, recording.rate, recording.data, never, seen);
        for (std::size_t k = 0; k < curve.size(); ++k) {
            const auto& found = pass.found[k];
            curve[k].by_recording[i] = judged_counts(recording, found.detections, found.eligible, judged);
        }
    });
}

void run_thresholds_apart(Curve& curve, const std::vector<DetectorSettings>& all,
                          const std::vector<ProofRecording>& recordings, const Judged& judged) {
    in_parallel(all.size() * recordings.size(), [&](std::size_t job) {
        const std::size_t k = job / recordings.size(), i = job % recordings.size();
        const auto engine = ran(all[k], recordings[i]);
        curve[k].by_recording[i] =
            judged_counts(recordings[i], detections_to_score(engine.events()), engine.eligible(), judged);
    });
}

} // namespace

// The evidence detector has vetoes of its own that a shared pass does not know: there the whole engine runs.
Curve curve_of(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings, const Judged& judged) {
    const bool evidence = settings.method == DetectionMethod::evidence;
    const auto& ladder = evidence ? evidence_ladder : textbook_ladder;
    Curve curve;
    std::vector<DetectorSettings> all;
    for (std::size_t i = 0; i < ladder.count; ++i) {
        curve.push_back({ladder.at(i), std::vector<Counts>(recordings.size())});
        all.push_back(with_threshold(settings, ladder.at(i)));
    }
    (evidence ? run_thresholds_apart : run_thresholds_together)(curve, all, recordings, judged);
    return curve;
}

CurvePoint run_as_is(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings) {
    CurvePoint point{0.0, std::vector<Counts>(recordings.size())};
    in_parallel(recordings.size(), [&](std::size_t i) {
        const auto engine = ran(settings, recordings[i]);
        point.by_recording[i] = counts_of(recordings[i], detections_to_score(engine.events()), engine.eligible());
    });
    point.threshold =
        Detector::make(settings, recordings.front().channels, recordings.front().rate).threshold_deviations();
    return point;
}

DetectorSettings textbook_chain() {
    DetectorSettings settings;
    settings.method = DetectionMethod::envelope;
    settings.evidence.features.clear(); // not looked at, and dear to compare where there are thousands of settings
    settings.evidence.calibration.clear();
    return settings;
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
    for (const double smoothing_ms : {6.0, 10.0, 16.0}) {
        const auto settings = two_bands(1.5, smoothing_ms);
        double found = 0.0;
        for (const auto& point : curve_of(settings, training)) {
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

DetectorSettings unlearned() {
    DetectorSettings settings;
    settings.method = DetectionMethod::evidence;
    return settings;
}

Learned learn_ours(const std::vector<ProofRecording>& training, const std::vector<FeatureSettings>& features) {
    return learn_ours_in_blocks(training, features, all_of_it_s);
}

Learned learn_ours_in_blocks(const std::vector<ProofRecording>& training, const std::vector<FeatureSettings>& features,
                             double block_s) {
    LearningPlan plan;
    plan.sweep.rate = training.front().rate;
    plan.sweep.armed = false;
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
    const auto smoothings = full ? std::vector<double>{2, 4, 6, 8, 10, 12, 16} : std::vector<double>{4, 8};
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
                            auto settings = textbook_chain();
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

using AtRates = std::array<AtRate, asked_false_per_minute.size()>;
constexpr std::size_t at_one = 1; // place of 1 a minute

std::vector<AtRates> at_rates(const std::vector<DetectorSettings>& places, std::span<const TuningRecording> recordings,
                              Hertz rate) {
    std::vector<DetectorSettings> candidates;
    for (const auto& place : places) {
        for (std::size_t i = 0; i < training_ladder.count; ++i) {
            candidates.push_back(with_threshold(place, training_ladder.at(i)));
        }
    }
    SweepPlan plan;
    plan.rate = rate;
    plan.block_s = all_of_it_s;
    plan.threads = processors();
    const auto results = sweep(recordings, candidates, plan);
    std::vector<AtRates> all(places.size());
    for (std::size_t place = 0; place < places.size(); ++place) {
        for (std::size_t k = 0; k < all[place].size(); ++k) {
            all[place][k] = at_rate(std::span(results).subspan(place * training_ladder.count, training_ladder.count),
                                    asked_false_per_minute[k]);
        }
    }
    return all;
}

// Those with the most hits at each false rate, and the quickest within `points` of the most at 1 a minute.
std::vector<DetectorSettings> most_promising(const std::vector<DetectorSettings>& places,
                                             const std::vector<AtRates>& figures, std::size_t each, double points) {
    std::vector<std::size_t> order(places.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::set<std::size_t> kept;
    const auto keep = [&] {
        kept.insert(order.begin(), order.begin() + static_cast<std::ptrdiff_t>(std::min(each, order.size())));
    };
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        std::stable_sort(order.begin(), order.end(),
                         [&](auto a, auto b) { return figures[a][k].found > figures[b][k].found; });
        keep();
        if (k == at_one) {
            const double most = figures[order.front()][k].found;
            const auto good = std::stable_partition(order.begin(), order.end(),
                                                    [&](auto i) { return figures[i][k].found >= most - points; });
            std::stable_sort(order.begin(), good,
                             [&](auto a, auto b) { return figures[a][k].latency_ms < figures[b][k].latency_ms; });
            keep();
        }
    }
    std::vector<DetectorSettings> chosen;
    std::transform(kept.begin(), kept.end(), std::back_inserter(chosen), [&](auto i) { return places[i]; });
    return chosen;
}

} // namespace

// Every setting on the first recording, the most promising ones on all of them.
TextbookChoice choose_textbook(const std::vector<ProofRecording>& training, Grid grid) {
    const auto& channels = training.front().channels;
    const auto count = [&](ChannelRole role) {
        return static_cast<std::size_t>(
            std::count_if(channels.begin(), channels.end(), [&](const auto& channel) { return channel.role == role; }));
    };
    const auto rate = training.front().rate;
    const auto recordings = for_tuning(training);
    const auto all = grid_of(grid, count(ChannelRole::reference) > 0, count(ChannelRole::ripple));
    const auto places = most_promising(all, at_rates(all, std::span(recordings).first(1), rate), 30, 0.05);
    const auto figures = at_rates(places, recordings, rate);
    TextbookChoice choice;
    choice.tried = all.size();
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        choice.best[k].settings = places.front();
        for (std::size_t i = 0; i < places.size(); ++i) {
            if (figures[i][k].found > choice.best[k].found) {
                choice.best[k] = {places[i], figures[i][k].found, figures[i][k].latency_ms};
            }
        }
    }
    choice.quick = choice.best[at_one];
    for (std::size_t i = 0; i < places.size(); ++i) {
        const auto& at = figures[i][at_one];
        if (at.found >= choice.best[at_one].found - 0.03 && at.latency_ms < choice.quick.latency_ms) {
            choice.quick = {places[i], at.found, at.latency_ms};
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
