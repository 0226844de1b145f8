// Writes a described struct as YAML that the reader takes back to the same values. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <yaml-cpp/yaml.h>

#include <string>
#include <string_view>
#include <vector>

namespace millpond {

/// Shortest text that reads back as the same double.
[[nodiscard]] std::string shortest(double value);

class YamlWriter {
  public:
    explicit YamlWriter(YAML::Emitter& out) : out_(out) {}

    void number(std::string_view key, double value, Range /*range*/, std::string_view /*doc*/) {
        entry(key) << shortest(value);
    }
    template <class Whole> void whole(std::string_view key, Whole value, Range /*range*/, std::string_view /*doc*/) {
        entry(key) << static_cast<long long>(value);
    }
    void flag(std::string_view key, bool value, std::string_view /*doc*/) { entry(key) << value; }
    void text(std::string_view key, const std::string& value, std::string_view /*doc*/) {
        entry(key) << YAML::DoubleQuoted << value;
    }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum value, const Choice<Enum> (&choices)[N], std::string_view /*doc*/) {
        entry(key) << std::string(word_for<Enum>(choices, value));
    }
    void numbers(std::string_view key, const std::vector<double>& values, Range /*range*/, std::string_view /*doc*/) {
        entry(key) << YAML::Flow << YAML::BeginSeq;
        for (const double value : values) {
            out_ << shortest(value);
        }
        out_ << YAML::EndSeq;
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view /*doc*/) {
        entry(key);
        mapping(value);
    }
    template <class Struct> void list(std::string_view key, std::vector<Struct>& values, std::string_view /*doc*/) {
        entry(key) << YAML::BeginSeq;
        for (auto& value : values) {
            mapping(value);
        }
        out_ << YAML::EndSeq;
    }

    template <class Struct> void mapping(Struct& value) {
        out_ << YAML::BeginMap;
        describe(*this, value);
        out_ << YAML::EndMap;
    }

  private:
    YAML::Emitter& entry(std::string_view key) { return out_ << YAML::Key << std::string(key) << YAML::Value; }

    YAML::Emitter& out_;
};

/// A described struct as YAML text.
template <class Struct> std::string to_yaml(Struct value) {
    YAML::Emitter out;
    YamlWriter writer(out);
    writer.mapping(value);
    return std::string(out.c_str()) + "\n";
}

} // namespace millpond
