#include "app/tune_learn.hpp"

#include "app/progress.hpp"
#include "app/stop_signals.hpp"
#include "base/refusal.hpp"
#include "journal/crc32c.hpp"
#include "tuning/learning.hpp"

#include <fmt/format.h>

namespace millpond {
namespace {

std::vector<TrainingSettings> training_of(const TuneOptions& options, const TunePlan& plan) {
    std::vector<TrainingSettings> all;
    const auto block = frames_in_ms(plan.sweep.block_s * 1000.0, plan.sweep.rate);
    for (std::size_t i = 0; i < plan.recordings.size(); ++i) {
        const auto& recording = plan.recordings[i];
        const std::span bytes(reinterpret_cast<const std::uint8_t*>(recording.data.data()),
                              recording.data.size_bytes());
        TrainingSettings training;
        training.recording = options.recordings[i].filename().string();
        training.checksum = fmt::format("{:08x}", crc32c(bytes));
        std::uint64_t frames = 0;
        for (const auto& part : parts_of(recording.frames(), block).training) {
            frames += part.to - part.from;
            training.ripples += static_cast<int>(
                std::count_if(recording.truth.begin(), recording.truth.end(), [&](const Ripple& ripple) {
                    return part.from <= ripple.onset && ripple.onset < part.to;
                }));
        }
        training.minutes = std::round(static_cast<double>(frames) / plan.sweep.rate.value / 60.0 * 100.0) / 100.0;
        all.push_back(std::move(training));
    }
    return all;
}

// Weights and pattern side by side, by channel, ready to be drawn.
std::string mix_table(const EvidenceSettings& evidence, const Channels& channels) {
    std::string text;
    for (const auto& mix : evidence.mixes) {
        text += fmt::format("mix {:<8}    channel           weight    pattern uV\n", mix.name);
        std::size_t place = 0;
        for (const auto& channel : channels) {
            if (channel.role != ChannelRole::unused) {
                text += fmt::format("                {:<16} {:>8.3f} {:>13.2f}\n", channel.name, mix.weights[place],
                                    mix.pattern[place]);
                ++place;
            }
        }
    }
    return text;
}

std::string told(const Learned& learned, const Channels& channels) {
    const auto& evidence = learned.detector.evidence;
    std::string text;
    if (learned.mix_gain > 0.0) {
        text += fmt::format(
            "mix         ripples stand out {:.1f} times in power, {:.1f} times in the plain mean of sites\n",
            learned.mix_gain, learned.mean_gain);
        text += mix_table(evidence, channels);
    }
    text += "feature     mix       band Hz     order smoothing ms  weight\n";
    for (const auto& feature : evidence.features) {
        text += fmt::format("            {:<9} {:>4}-{:<6} {:>5} {:>12} {:>9.3f}\n", feature.mix, feature.low_hz,
                            feature.high_hz, feature.order, feature.smoothing_ms, feature.weight);
    }
    text += "threshold   deviations  false per minute (training parts)\n";
    for (const auto& point : evidence.calibration) {
        text += fmt::format("            {:>10.2f} {:>13.2f}\n", point.deviations, point.per_minute);
    }
    return text;
}

} // namespace

LearnOutcome learn_from(const TuneOptions& options, const TunePlan& plan) {
    LearningPlan learning;
    learning.sweep = plan.sweep;
    learning.false_per_minute = options.max_false_per_minute;
    learning.features = usual_features(options.plain_mean ? sites_mix : learned_mix);
    Progress progress("learn", 1.0);
    const StopSignals signals;
    SweepWatch watch;
    watch.progress = [&](double share) { progress.at(share); };
    watch.stop = [] { return StopSignals::wished(); };
    LearnOutcome outcome;
    auto learned = learn_evidence(plan.recordings, plan.base.detector, learning, watch);
    learned.detector.evidence.trained_on = training_of(options, plan);
    const std::vector<DetectorSettings> only{learned.detector};
    const std::vector<std::size_t> first{0};
    const auto figures = confirm(plan.recordings, only, first, plan.sweep, watch);
    if (!figures.front()) {
        throw Refusal("tune", "a wish to stop", "patience: nothing was written");
    }
    outcome.figures = *figures.front();
    outcome.text = told(learned, plan.recordings.front().channels);
    outcome.detector = std::move(learned.detector);
    return outcome;
}

} // namespace millpond
