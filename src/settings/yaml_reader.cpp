#include "settings/yaml_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::string shown(const YAML::Node& node) {
    switch (node.Type()) {
    case YAML::NodeType::Scalar:
        return "'" + node.Scalar() + "'";
    case YAML::NodeType::Sequence:
        return "a list";
    case YAML::NodeType::Map:
        return "a group of keys";
    default:
        return "nothing";
    }
}

std::string allowed_range(std::string_view what, Range range) {
    return fmt::format("{} from {} to {}", what, range.least, range.most);
}

std::string joined(const std::vector<std::string>& words) {
    return fmt::format("{}", fmt::join(words, ", "));
}

} // namespace

YamlReader::YamlReader(std::string file, std::string path, YAML::Node mapping)
    : file_(std::move(file)), path_(std::move(path)), mapping_(std::move(mapping)) {
    if (!mapping_.IsMap() && !mapping_.IsNull()) {
        throw Refusal(fmt::format("{}:{}: {}", file_, mapping_.Mark().line + 1, path_.empty() ? "whole file" : path_),
                      shown(mapping_), "a group of keys");
    }
    std::vector<std::string> seen;
    for (const auto& entry : mapping_) {
        const auto key = entry.first.IsScalar() ? entry.first.Scalar() : std::string{};
        if (std::find(seen.begin(), seen.end(), key) != seen.end()) {
            throw Refusal(where(key, entry.first), "this key twice", "each key once");
        }
        seen.push_back(key);
    }
}

YAML::Node YamlReader::take(std::string_view key) {
    known_.emplace_back(key);
    if (!mapping_.IsMap()) {
        return YAML::Node(YAML::NodeType::Undefined);
    }
    return static_cast<const YAML::Node&>(mapping_)[std::string(key)];
}

std::string YamlReader::dotted(std::string_view key) const {
    return path_.empty() ? std::string(key) : path_ + "." + std::string(key);
}

std::string YamlReader::where(std::string_view key, const YAML::Node& node) const {
    return fmt::format("{}:{}: {}", file_, node.Mark().line + 1, dotted(key));
}

void YamlReader::number(std::string_view key, double& value, Range range, std::string_view /*doc*/) {
    const auto node = take(key);
    if (!node) {
        return;
    }
    value = number_in(node, key, range);
}

double YamlReader::number_in(const YAML::Node& node, std::string_view key, Range range) const {
    double read = 0.0;
    // NaN and infinity are YAML numbers; the range check refuses both.
    if (!node.IsScalar() || !YAML::convert<double>::decode(node, read) ||
        !(read >= range.least && read <= range.most)) {
        throw Refusal(where(key, node), shown(node), allowed_range("a number", range));
    }
    return read;
}

void YamlReader::numbers(std::string_view key, std::vector<double>& values, Range range, std::string_view /*doc*/) {
    const auto node = take(key);
    if (!node) {
        return;
    }
    require_sequence(key, node);
    values.clear();
    for (const auto& each : node) {
        values.push_back(number_in(each, key, range));
    }
}

void YamlReader::read_whole(std::string_view key, std::int64_t& value, Range range) {
    const auto node = take(key);
    if (!node) {
        return;
    }
    std::int64_t read = 0;
    if (!node.IsScalar() || !YAML::convert<std::int64_t>::decode(node, read) ||
        !(static_cast<double>(read) >= range.least && static_cast<double>(read) <= range.most)) {
        throw Refusal(where(key, node), shown(node), allowed_range("a whole number", range));
    }
    value = read;
}

void YamlReader::flag(std::string_view key, bool& value, std::string_view /*doc*/) {
    const auto node = take(key);
    if (node && (!node.IsScalar() || !YAML::convert<bool>::decode(node, value))) {
        throw Refusal(where(key, node), shown(node), "true or false");
    }
}

void YamlReader::text(std::string_view key, std::string& value, std::string_view /*doc*/) {
    const auto node = take(key);
    if (!node) {
        return;
    }
    if (!node.IsScalar()) {
        throw Refusal(where(key, node), shown(node), "a text");
    }
    value = node.Scalar();
}

std::size_t YamlReader::read_choice(std::string_view key, const std::vector<std::string>& words) {
    const auto node = take(key);
    if (!node) {
        return words.size();
    }
    const auto found = node.IsScalar() ? std::find(words.begin(), words.end(), node.Scalar()) : words.end();
    if (found == words.end()) {
        throw Refusal(where(key, node), shown(node), "one of " + joined(words));
    }
    return static_cast<std::size_t>(found - words.begin());
}

void YamlReader::require_sequence(std::string_view key, const YAML::Node& node) const {
    if (!node.IsSequence()) {
        throw Refusal(where(key, node), shown(node), "a list");
    }
}

void YamlReader::finish() const {
    for (const auto& entry : mapping_) {
        const auto key = entry.first.IsScalar() ? entry.first.Scalar() : std::string{};
        if (std::find(known_.begin(), known_.end(), key) == known_.end()) {
            const auto near = nearest_name(key, known_);
            throw Refusal(where(key, entry.first), "an unknown key",
                          (near.empty() ? std::string{} : "did you mean '" + near + "'? one of ") + joined(known_));
        }
    }
}

YAML::Node load_yaml_file(const std::filesystem::path& file) {
    try {
        return YAML::LoadFile(file.string());
    } catch (const YAML::BadFile&) {
        throw Refusal(file.string(), "no file that can be read", "a YAML file");
    } catch (const YAML::Exception& trouble) {
        throw Refusal(fmt::format("{}:{}", file.string(), trouble.mark.line + 1), trouble.msg, "YAML 1.2");
    }
}

} // namespace millpond
