// Settings of the textbook chain as bench/scipy_textbook.py takes them. For tests and the proof bench.
#pragma once

#include "base/channels.hpp"
#include "base/units.hpp"
#include "detector/detector_settings.hpp"

#include <nlohmann/json.hpp>

namespace millpond::test {

inline nlohmann::json textbook_json(const DetectorSettings& settings, const Channels& channels, Hertz rate) {
    nlohmann::json json{
        {"rate_hz", rate.value},
        {"low_hz", settings.filter.low_hz},
        {"high_hz", settings.filter.high_hz},
        {"order", settings.filter.order},
        {"method", word_for<EnvelopeMethod>(envelope_methods, settings.envelope.method)},
        {"smoothing_ms", settings.envelope.smoothing_ms},
        {"time_constant_s", settings.floor.time_constant_s},
        {"clip_deviations", settings.floor.clip_deviations},
        {"settle_s", settings.floor.settle_s},
        {"freeze_ms", settings.floor.freeze_ms},
        {"deviations", settings.threshold.deviations},
        {"rearm_deviations", settings.threshold.rearm_deviations},
        {"rule", word_for<VoteRule>(vote_rules, settings.vote.rule)},
        {"sites_needed", settings.vote.sites_needed},
        {"veto_deviations", settings.veto.deviations},
        {"veto_window_ms", settings.veto.window_ms},
    };
    for (const auto& channel : channels) {
        json["roles"].push_back(word_for<ChannelRole>(channel_roles, channel.role));
    }
    return json;
}

} // namespace millpond::test
