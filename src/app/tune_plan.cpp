#include "app/tune_plan.hpp"

#include "app/from_settings.hpp"
#include "app/progress.hpp"
#include "app/wiring.hpp"
#include "base/refusal.hpp"
#include "referee/referee.hpp"
#include "referee/referee_report.hpp"
#include "settings/yaml_reader.hpp"
#include "settings/yaml_writer.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>
#include <regex>

namespace millpond {
namespace {

// Tells recordings, ripples and grids apart; 64 bits at a time, since samples are many. No shield against intent.
class Checksum {
  public:
    void add(std::uint64_t word) noexcept {
        hash_ = (hash_ ^ word) * 0x9E3779B97F4A7C15U; // odd: no two words give the same
        hash_ ^= hash_ >> 32;
    }
    void add(std::string_view text) noexcept {
        add(text.size());
        for (const char c : text) {
            add(static_cast<std::uint64_t>(static_cast<unsigned char>(c)));
        }
    }
    void add(std::span<const float> values) noexcept {
        add(values.size());
        for (const float value : values) {
            std::uint32_t bits = 0;
            std::memcpy(&bits, &value, sizeof bits);
            add(bits);
        }
    }
    [[nodiscard]] std::string text() const { return fmt::format("{:016x}", hash_); }

  private:
    std::uint64_t hash_ = 0;
};

TuneGrid listed(const TuneOptions& options, const std::vector<std::string>& keys) {
    YAML::Node root;
    for (const auto& key : keys) {
        const auto dot = key.find('.');
        for (const auto& value : options.lists.at(key)) {
            root["detector"][key.substr(0, dot)][key.substr(dot + 1)].push_back(value);
        }
    }
    return TuneGrid::from_text(YAML::Dump(root), "command line");
}

// Without a grid of its own each method has what is worth trying of it.
TuneGrid grid_of(const TuneOptions& options, const DetectorSettings& base) {
    const bool evidence = base.method == DetectionMethod::evidence;
    if (options.grid.empty()) {
        if (evidence && options.given_lists.empty()) {
            return TuneGrid::from_text(
                "detector: {evidence: {false_per_minute: [0.1, 0.2, 0.3, 0.5, 0.7, 1, 1.5, 2, 3, "
                "5, 10]}, floor: {time_constant_s: [10, 20, 60]}}",
                "defaults");
        }
        std::vector<std::string> keys;
        for (const auto& list : options.lists) {
            keys.push_back(list.first);
        }
        return listed(options, keys);
    }
    auto grid = TuneGrid::from_file(options.grid);
    if (!options.given_lists.empty()) {
        grid.add(listed(options, options.given_lists));
    }
    return grid;
}

void add_truth(const TuneOptions& options, std::size_t index, TuningRecording& recording, Hertz rate) {
    if (!options.labels.empty()) {
        recording.truth = ripples_from_table(options.labels[index], rate, recording.frames(), options.label_reading);
        return;
    }
    const auto settings = referee_settings_of(options.referee);
    auto found =
        find_ripples(settings, recording.channels, rate, {SampleIndex{0}, recording.channels.size(), recording.data},
                     options.referee.empty() ? "referee" : options.referee);
    fmt::print(stderr, "referee: {}: {} ripples, rule {}; artefacts: {}\n",
               options.recordings[index].filename().string(), found.ripples.size(), rule_text(settings),
               artefacts_text(settings, found, recording.channels, rate));
    recording.truth = std::move(found.ripples);
    recording.excluded = std::move(found.artefacts.excluded);
}

void load(TunePlan& plan, const TuneOptions& options) {
    Progress progress("reading", static_cast<double>(options.recordings.size()));
    for (const auto& path : options.recordings) {
        plan.files.push_back(load_recording(path));
        const auto& file = plan.files.back();
        const auto& first = plan.files.front();
        if (file.info.rate != first.info.rate) {
            throw Refusal(path.string(), fmt::format("{} Hz", file.info.rate.value),
                          fmt::format("the rate of the first recording, {} Hz", first.info.rate.value));
        }
        TuningRecording recording{
            channels_for(plan.base, file.info.channels, options.base.string()), file.data, {}, {}};
        add_truth(options, plan.recordings.size(), recording, file.info.rate);
        plan.recordings.push_back(std::move(recording));
        progress.at(static_cast<double>(plan.files.size()));
    }
}

WorkIdentity identity_of(const TunePlan& plan) {
    Checksum samples, truth, settings;
    for (const auto& recording : plan.recordings) {
        for (const auto& channel : recording.channels) {
            samples.add(to_yaml(channel));
        }
        samples.add(recording.data);
        truth.add(recording.truth.size());
        for (const auto& ripple : recording.truth) {
            truth.add(ripple.onset.value);
            truth.add(ripple.end.value);
        }
        for (const auto& interval : recording.excluded) {
            truth.add(interval.from.value);
            truth.add(interval.to.value);
        }
    }
    samples.add(shortest(plan.sweep.rate.value));
    for (const auto& candidate : plan.candidates.settings) {
        settings.add(to_yaml(candidate));
    }
    settings.add(to_yaml(plan.sweep.arbiter) + to_yaml(plan.sweep.arbiter.limits));
    settings.add(shortest(plan.sweep.block_s) + " " + shortest(plan.sweep.early_ms));
    return {program_name(), samples.text(), truth.text(), settings.text(), plan.candidates.settings.size()};
}

} // namespace

SweepPart part_of(const std::string& text) {
    std::smatch match;
    if (std::regex_match(text, match, std::regex("([0-9]{1,6})/([0-9]{1,6})"))) {
        const SweepPart part{std::stoul(match[1]), std::stoul(match[2])};
        if (part.number >= 1 && part.number <= part.of) {
            return part;
        }
    }
    throw Refusal("--part", "'" + text + "'", "K/N with K from 1 to N, such as 3/20");
}

TunePlan make_tune_plan(const TuneOptions& options) {
    TunePlan plan;
    plan.base = options.base.empty() ? Settings{} : load_settings(options.base);
    plan.candidates = candidates_of(grid_of(options, plan.base.detector), plan.base.detector);
    if (plan.candidates.settings.empty()) {
        throw Refusal("grid", "no combination with low_hz below high_hz and the re-arm level at most the threshold",
                      "one or more");
    }
    load(plan, options);
    plan.sweep.rate = plan.files.front().info.rate;
    plan.sweep.arbiter = plan.base.arbiter;
    plan.sweep.arbiter.limits = for_sweeps(plan.base.arbiter.limits);
    plan.sweep.arbiter.plan = {};
    plan.sweep.early_ms = options.labels.empty() ? referee_early_ms : 0.0;
    plan.sweep.block_s = options.block_s;
    plan.sweep.threads = options.threads;
    plan.identity = identity_of(plan);
    return plan;
}

} // namespace millpond
