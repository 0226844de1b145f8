#include "referee/referee_rules.hpp"

#include "referee/score_json.hpp"

#include <fmt/format.h>

namespace millpond {
namespace {

RefereeSettings gillespie_2024() {
    RefereeSettings rule;
    rule.clip_deviations = 0.0;
    rule.clip_again = false;
    rule.peak_deviations = 2.0;
    rule.edge_deviations = 0.0;
    rule.min_above_peak_ms = 15.0;
    rule.min_duration_ms = 0.0;
    rule.merge_gap_ms = 0.0;
    return rule;
}

RefereeSettings deceuninck_2024() {
    RefereeSettings rule;
    rule.envelope = RefereeEnvelope::mean_analytic;
    rule.low_hz = 140.0;
    rule.high_hz = 225.0;
    rule.smoothing_ms = 15.0;
    rule.floor = RefereeFloor::median_and_quartile;
    rule.clip_deviations = 0.0;
    rule.clip_again = false;
    rule.peak_deviations = 9.0;
    rule.edge_deviations = 9.0;
    rule.min_duration_ms = 40.0;
    rule.merge_gap_ms = 20.0;
    return rule;
}

RefereeSettings stark_2014() {
    RefereeSettings rule;
    rule.clip_deviations = 4.0;
    rule.clip_again = false;
    return rule;
}

} // namespace

RefereeSettings settings_of(RefereeRule rule) {
    RefereeSettings settings;
    switch (rule) {
    case RefereeRule::millpond:
        break;
    case RefereeRule::gillespie_2024:
        settings = gillespie_2024();
        break;
    case RefereeRule::deceuninck_2024:
        settings = deceuninck_2024();
        break;
    case RefereeRule::stark_2014:
        settings = stark_2014();
        break;
    }
    settings.rule = rule;
    return settings;
}

std::optional<RefereeRule> rule_named(std::string_view name) noexcept {
    for (const auto& rule : referee_rules) {
        if (rule.word == name) {
            return rule.value;
        }
    }
    return {};
}

std::optional<Departure> departure_from_rule(const RefereeSettings& settings) {
    if (settings.rule == RefereeRule::millpond) {
        return {};
    }
    const auto found = json_of(settings), fixed = json_of(settings_of(settings.rule));
    for (const auto& [key, value] : fixed.items()) {
        if (key != "artefacts" && found.at(key) != value) {
            return Departure{key, found.at(key).dump(), value.dump()};
        }
    }
    return {};
}

std::string allowed_instead(const Departure& departure, RefereeRule rule) {
    return fmt::format("{}, which rule {} fixes; rule millpond leaves every key free", departure.fixed,
                       word_for<RefereeRule>(referee_rules, rule));
}

} // namespace millpond
