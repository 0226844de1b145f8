#include "referee/referee_report.hpp"

#include "referee/referee_rules.hpp"
#include "referee/score_json.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

double seconds_in(const Intervals& intervals, Hertz rate) {
    return static_cast<double>(frames_in(intervals)) / rate.value;
}

std::string names_of(const std::vector<std::size_t>& places, const Channels& channels) {
    std::string names;
    for (const auto place : places) {
        names += (names.empty() ? "" : ", ") + channels[place].name;
    }
    return names;
}

bool has_reference(const Channels& channels) {
    return std::any_of(channels.begin(), channels.end(),
                       [](const Channel& channel) { return channel.role == ChannelRole::reference; });
}

} // namespace

std::string rule_text(const RefereeSettings& settings) {
    auto rule = settings_of(settings.rule);
    rule.artefacts = settings.artefacts;
    return std::string(word_for<RefereeRule>(referee_rules, settings.rule)) + (rule == settings ? "" : ", changed");
}

std::string artefacts_text(const RefereeSettings& settings, const RefereeFindings& findings, const Channels& channels,
                           Hertz rate) {
    if (!settings.artefacts.exclude) {
        return "not looked for";
    }
    const auto& found = findings.artefacts;
    std::string text = fmt::format("left out {:.1f} s: {} missing, {} railed, {} flat, ",
                                   seconds_in(found.excluded, rate), found.missing, found.railed, found.flat);
    text += has_reference(channels) ? fmt::format("{} common", found.common) : "common not looked for (no reference)";
    text += fmt::format("; {} events dropped", findings.dropped_events);
    if (!found.dead_channels.empty()) {
        text += fmt::format("; flat for half of the time or more, so better of role unused: {}",
                            names_of(found.dead_channels, channels));
    }
    return text;
}

nlohmann::ordered_json referee_json(const RefereeSettings& settings, const RefereeFindings& findings,
                                    const Channels& channels, Hertz rate) {
    const auto& found = findings.artefacts;
    Json dead = Json::array();
    for (const auto place : found.dead_channels) {
        dead.push_back(channels[place].name);
    }
    return {{"rule", rule_text(settings)},
            {"settings", json_of(settings)},
            {"floor_uv", findings.floor},
            {"spread_uv", findings.spread},
            {"frames_judged", findings.frames_judged},
            {"artefacts",
             {{"excluded_s", seconds_in(found.excluded, rate)},
              {"intervals", found.excluded.size()},
              {"missing", found.missing},
              {"railed", found.railed},
              {"flat", found.flat},
              {"common", found.common},
              {"events_dropped", findings.dropped_events},
              {"dead_channels", dead}}}};
}

} // namespace millpond
