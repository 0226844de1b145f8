#include "app/truth.hpp"

#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "referee/referee_rules.hpp"
#include "settings/yaml_reader.hpp"
#include "synth/scene_element.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

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

Ripple ripple_of(const TableEvent& event, Hertz rate, double point_ms, const std::string& table) {
    double onset_s = event.onset_s, end_s = event.onset_s + event.duration_s;
    if (event.duration_s <= 0.0) {
        if (point_ms <= 0.0) {
            throw Refusal(table, fmt::format("a {} at {:.3f} s without a duration", event.trial_type, onset_s),
                          "durations above 0, since a detection counts from onset to end, or --point-label-ms");
        }
        onset_s -= point_ms / 2000.0;
        end_s = onset_s + point_ms / 1000.0;
    }
    return {frame_at(onset_s, rate), frame_at((onset_s + end_s) / 2.0, rate), frame_at(end_s, rate), 0.0};
}

void refuse_overlaps(const Ripples& ripples, Hertz rate, const std::string& table) {
    for (std::size_t i = 1; i < ripples.size(); ++i) {
        if (ripples[i].onset < ripples[i - 1].end) {
            throw Refusal(table,
                          fmt::format("ripples at {:.3f} s and {:.3f} s that overlap",
                                      seconds_at(ripples[i - 1].onset, rate), seconds_at(ripples[i].onset, rate)),
                          "one row for each ripple, the next one not before its end");
        }
    }
}

std::string types_in(const std::vector<TableEvent>& events) {
    std::map<std::string, std::size_t> counts;
    for (const auto& event : events) {
        ++counts[event.trial_type];
    }
    std::string text;
    for (const auto& [type, count] : counts) {
        text += fmt::format("{}{} '{}'", text.empty() ? "" : ", ", count, type);
    }
    return text;
}

} // namespace

Ripples ripples_from_table(const std::filesystem::path& table, Hertz rate, std::uint64_t frames,
                           const LabelReading& reading) {
    const auto events = read_events_table(table, rate.value);
    Ripples ripples;
    for (const auto& event : events) {
        if (event.trial_type != reading.type || event.onset_s + event.duration_s < 0.0) {
            continue; // what ended before the first sample is not in the recording
        }
        const auto ripple = ripple_of(event, rate, reading.point_ms, table.string());
        if (ripple.onset.value >= frames) {
            throw Refusal(
                table.string(), fmt::format("a ripple at {:.3f} s", event.onset_s),
                fmt::format("onsets within the recording's {:.3f} s", static_cast<double>(frames) / rate.value));
        }
        ripples.push_back(ripple);
    }
    const bool invented = std::all_of(events.begin(), events.end(), stands_beside_ripples);
    if (ripples.empty() && !invented) {
        throw Refusal(
            table.string(),
            fmt::format("{} rows, none of trial_type {}, but {}", events.size(), reading.type, types_in(events)),
            "ripples (--label-type for another word), or a table without rows where there are none");
    }
    std::stable_sort(ripples.begin(), ripples.end(),
                     [](const Ripple& a, const Ripple& b) { return a.onset < b.onset; });
    refuse_overlaps(ripples, rate, table.string());
    return ripples;
}

RefereeSettings referee_settings_of(const std::string& rule_or_file) {
    if (rule_or_file.empty()) {
        return {};
    }
    if (const auto rule = rule_named(rule_or_file)) {
        return settings_of(*rule);
    }
    const auto node = load_yaml_file(rule_or_file);
    const auto read = [&](RefereeSettings settings) {
        YamlReader reader(rule_or_file, "", node);
        describe(reader, settings);
        reader.finish();
        return settings;
    };
    // Twice: keys that are not given have the values of the rule, which the file itself names.
    const auto settings = read(settings_of(read({}).rule));
    if (const auto departure = departure_from_rule(settings)) {
        throw Refusal(fmt::format("{}:{}: {}", rule_or_file, node[departure->key].Mark().line + 1, departure->key),
                      departure->found, allowed_instead(*departure, settings.rule));
    }
    return settings;
}

void add_label_options(CLI::App& command, LabelReading& reading, CLI::Option* labels) {
    command.add_option("--label-type", reading.type, "trial_type of the rows of --labels that are ripples")
        ->needs(labels)
        ->capture_default_str();
    command
        .add_option("--point-label-ms", reading.point_ms,
                    "length given to labels without a duration, half of it before their onset; else they are refused")
        ->needs(labels)
        ->check(CLI::Range(1.0, 1000.0));
}

std::string referee_help() {
    std::string names;
    for (const auto& rule : referee_rules) {
        names += (names.empty() ? "" : ", ") + std::string(rule.word);
    }
    return "the referee's rule, by name (" + names + ")\nor as a YAML file with its settings; else millpond";
}

} // namespace millpond
