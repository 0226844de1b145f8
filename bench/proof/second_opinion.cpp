#include "proof/second_opinion.hpp"

#include "support/bench.hpp"

#include <nlohmann/json.hpp>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

namespace millpond::bench {
namespace {

nlohmann::json json_of(const DetectorSettings& settings, const Channels& channels, Hertz rate) {
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

} // namespace

std::vector<SampleIndex> scipy_textbook(const DetectorSettings& settings, const Channels& channels, Hertz rate,
                                        std::span<const float> data) {
    auto pattern = (std::filesystem::temp_directory_path() / "millpond-proof-XXXXXX").string();
    if (mkdtemp(pattern.data()) == nullptr) {
        throw std::runtime_error("no temporary folder");
    }
    const std::filesystem::path folder = pattern;
    std::ofstream(folder / "frames.f32", std::ios::binary)
        .write(reinterpret_cast<const char*>(data.data()), static_cast<std::streamsize>(data.size_bytes()));
    std::ofstream(folder / "settings.json") << json_of(settings, channels, rate);
    std::istringstream lines(output_of("/usr/bin/python3 " MILLPOND_SOURCE_DIR "/bench/scipy_textbook.py " +
                                       (folder / "frames.f32").string() + " " + (folder / "settings.json").string()));
    std::filesystem::remove_all(folder);
    std::vector<SampleIndex> found;
    for (std::uint64_t at = 0; lines >> at;) {
        found.push_back({at});
    }
    return found;
}

std::size_t shared(const std::vector<SampleIndex>& a, const std::vector<SampleIndex>& b, std::uint64_t frames) {
    return static_cast<std::size_t>(std::count_if(a.begin(), a.end(), [&](SampleIndex at) {
        const auto near = std::lower_bound(b.begin(), b.end(), SampleIndex{at.value - std::min(at.value, frames)});
        return near != b.end() && near->value <= at.value + frames;
    }));
}

} // namespace millpond::bench
