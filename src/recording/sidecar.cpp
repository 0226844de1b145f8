#include "recording/sidecar.hpp"

#include "base/refusal.hpp"
#include "recording/whole_file.hpp"
#include "settings/yaml_reader.hpp"

#include <fmt/format.h>

#include <set>

namespace millpond {
namespace {

std::filesystem::path with_suffix(const std::filesystem::path& file, const char* suffix) {
    return file.string() + suffix;
}

} // namespace

std::filesystem::path sidecar_path(const std::filesystem::path& recording) {
    return with_suffix(recording, ".yaml");
}

std::filesystem::path truth_path(const std::filesystem::path& recording) {
    return with_suffix(recording, ".truth.tsv");
}

Sidecar read_sidecar(const std::filesystem::path& recording, const std::filesystem::path& sidecar) {
    const auto file = sidecar.empty() ? sidecar_path(recording) : sidecar;
    if (sidecar.empty() && !std::filesystem::exists(file)) {
        return {};
    }
    auto said = read_yaml_file<Sidecar>(file);
    std::set<std::string> names;
    for (const auto& channel : said.channels) {
        if (channel.name.empty()) {
            throw Refusal(file.string() + ": channels", "a channel without a name", "a name for each channel");
        }
        if (!names.insert(channel.name).second) {
            throw Refusal(file.string() + ": channels", "'" + channel.name + "' twice", "each name once");
        }
    }
    return said;
}

void write_sidecar(const std::filesystem::path& sidecar, const Sidecar& said) {
    YAML::Emitter out;
    out << YAML::BeginMap;
    if (said.microvolts_per_count != 0.0) {
        out << YAML::Key << "microvolts_per_count" << YAML::Value << fmt::format("{}", said.microvolts_per_count);
    }
    if (said.rate_hz != 0.0) {
        out << YAML::Key << "rate_hz" << YAML::Value << fmt::format("{}", said.rate_hz);
    }
    if (said.channel_count != 0) {
        out << YAML::Key << "channel_count" << YAML::Value << said.channel_count;
    }
    if (said.encoding != Encoding::unsaid) {
        out << YAML::Key << "encoding" << YAML::Value
            << std::string(word_for(std::span<const Choice<Encoding>>(encodings), said.encoding));
    }
    if (!said.channels.empty()) {
        out << YAML::Key << "channels" << YAML::Value << YAML::BeginSeq;
        for (const auto& channel : said.channels) {
            out << YAML::Flow << YAML::BeginMap << YAML::Key << "name" << YAML::Value << channel.name << YAML::Key
                << "role" << YAML::Value
                << std::string(word_for(std::span<const Choice<ChannelRole>>(channel_roles), channel.role))
                << YAML::EndMap;
        }
        out << YAML::EndSeq;
    }
    out << YAML::EndMap;
    write_whole_file(sidecar, std::string(out.c_str()) + "\n");
}

Channels named_channels(const Sidecar& sidecar, const std::string& sidecar_name, std::size_t channel_count) {
    if (sidecar.channels.empty()) {
        return ripple_channels(channel_count);
    }
    if (sidecar.channels.size() != channel_count) {
        throw Refusal(sidecar_name + ": channels", fmt::format("{} channels", sidecar.channels.size()),
                      fmt::format("the recording's {}", channel_count));
    }
    return sidecar.channels;
}

} // namespace millpond
