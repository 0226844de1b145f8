// Reads a described struct from YAML, strictly: unknown, repeated, missing-typed and out-of-range keys are refused with
// file, line, key, what was found and what is allowed. Thread: control.
#pragma once

#include "base/describe.hpp"
#include "base/refusal.hpp"

#include <yaml-cpp/yaml.h>

#include <cstdint>
#include <filesystem>
#include <string>
#include <string_view>
#include <type_traits>
#include <vector>

namespace millpond {

/// One mapping of a YAML file on its way into a struct. `path` is the dotted key of the mapping itself.
class YamlReader {
  public:
    /// Refuses a node that is neither a mapping nor empty.
    YamlReader(std::string file, std::string path, YAML::Node mapping);

    void number(std::string_view key, double& value, Range range, std::string_view doc);
    void flag(std::string_view key, bool& value, std::string_view doc);
    void text(std::string_view key, std::string& value, std::string_view doc);
    void numbers(std::string_view key, std::vector<double>& values, Range range, std::string_view doc);

    template <class Whole>
    void whole(std::string_view key, Whole& value, Range range, [[maybe_unused]] std::string_view doc) {
        static_assert(std::is_integral_v<Whole>);
        std::int64_t read = static_cast<std::int64_t>(value);
        read_whole(key, read, range);
        value = static_cast<Whole>(read);
    }

    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum& value, const Choice<Enum> (&choices)[N],
                [[maybe_unused]] std::string_view doc) {
        std::vector<std::string> words;
        for (const auto& choice : choices) {
            words.emplace_back(choice.word);
        }
        const auto picked = read_choice(key, words);
        if (picked < N) {
            value = choices[picked].value;
        }
    }

    template <class Struct> void group(std::string_view key, Struct& value, [[maybe_unused]] std::string_view doc) {
        if (const auto node = take(key); node) {
            YamlReader inner(file_, dotted(key), node);
            describe(inner, value);
            inner.finish();
        }
    }

    template <class Struct>
    void list(std::string_view key, std::vector<Struct>& values, [[maybe_unused]] std::string_view doc) {
        const auto node = take(key);
        if (!node) {
            return;
        }
        require_sequence(key, node);
        values.clear();
        for (std::size_t i = 0; i < node.size(); ++i) {
            Struct value{};
            YamlReader inner(file_, dotted(key) + "[" + std::to_string(i) + "]", node[i]);
            describe(inner, value);
            inner.finish();
            values.push_back(std::move(value));
        }
    }

    /// Refuses keys that nobody asked for. Call after `describe`.
    void finish() const;

  private:
    YAML::Node take(std::string_view key);
    [[nodiscard]] double number_in(const YAML::Node& node, std::string_view key, Range range) const;
    void read_whole(std::string_view key, std::int64_t& value, Range range);
    std::size_t read_choice(std::string_view key, const std::vector<std::string>& words);
    void require_sequence(std::string_view key, const YAML::Node& node) const;
    [[nodiscard]] std::string dotted(std::string_view key) const;
    [[nodiscard]] std::string where(std::string_view key, const YAML::Node& node) const;

    std::string file_;
    std::string path_;
    YAML::Node mapping_;
    std::vector<std::string> known_;
};

/// The file as one YAML mapping. Refuses what cannot be opened or is not YAML.
YAML::Node load_yaml_file(const std::filesystem::path& file);

/// Reads all of `file` into a described struct that starts from its defaults.
template <class Struct> Struct read_yaml_file(const std::filesystem::path& file) {
    Struct value{};
    YamlReader reader(file.string(), "", load_yaml_file(file));
    describe(reader, value);
    reader.finish();
    return value;
}

} // namespace millpond
