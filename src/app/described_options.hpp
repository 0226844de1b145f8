// Command-line options for every key of a described struct: rate_hz becomes --rate-hz, ripples.rate_per_s becomes
// --ripples-rate-per-s. Declared before the command line is read, applied after whatever the options override.
// Thread: control. Bad values throw Refusal.
//
//     DescribedOptions options;                     // must outlive the parsing
//     options.declare(*command, SceneSettings{});   // defaults, for the help
//     ...
//     options.apply(settings);                      // only what was given
#pragma once

#include "base/describe.hpp"

#include <CLI/App.hpp>

#include <map>
#include <string>
#include <string_view>
#include <vector>

namespace millpond {

class DescribedOptions {
  public:
    template <class Struct> void declare(CLI::App& command, Struct defaults);
    template <class Struct> void apply(Struct& settings) const;

  private:
    class Declarer;
    class Applier;

    struct Given {
        std::string value;
        CLI::Option* option = nullptr;
    };

    /// std::map: the values' places do not change while the command line's parser holds on to them.
    std::map<std::string, Given, std::less<>> given_;

    void add(CLI::App& command, const std::string& path, bool flag, const std::string& help);
    /// What was given for `path`; null where nothing was.
    [[nodiscard]] const std::string* find(const std::string& path) const;
    static double number(const std::string& path, const std::string& given, Range range);
    static std::int64_t whole(const std::string& path, const std::string& given, Range range);
    static bool flag(const std::string& given);
    static std::size_t choice(const std::string& path, const std::string& given, const std::vector<std::string>& words);
    static std::string range_help(std::string_view doc, double value, Range range);
};

class DescribedOptions::Declarer {
  public:
    Declarer(DescribedOptions& options, CLI::App& command, std::string prefix)
        : options_(options), command_(command), prefix_(std::move(prefix)) {}

    void number(std::string_view key, double& value, Range range, std::string_view doc) {
        options_.add(command_, prefix_ + std::string(key), false, range_help(doc, value, range));
    }
    template <class Whole> void whole(std::string_view key, Whole& value, Range range, std::string_view doc) {
        options_.add(command_, prefix_ + std::string(key), false, range_help(doc, static_cast<double>(value), range));
    }
    void flag(std::string_view key, bool& /*value*/, std::string_view doc) {
        options_.add(command_, prefix_ + std::string(key), true, std::string(doc));
    }
    void text(std::string_view key, std::string& /*value*/, std::string_view doc) {
        options_.add(command_, prefix_ + std::string(key), false, std::string(doc));
    }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum& value, const Choice<Enum> (&choices)[N], std::string_view doc) {
        std::string help = std::string(doc) + " (";
        for (const auto& each : choices) {
            help += std::string(each.word) + (each.value == value ? " (default)" : "") +
                    (&each == &choices[N - 1] ? ")" : ", ");
        }
        options_.add(command_, prefix_ + std::string(key), false, help);
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view /*doc*/) {
        Declarer inner(options_, command_, prefix_ + std::string(key) + ".");
        describe(inner, value);
    }

  private:
    DescribedOptions& options_;
    CLI::App& command_;
    std::string prefix_;
};

class DescribedOptions::Applier {
  public:
    Applier(const DescribedOptions& options, std::string prefix) : options_(options), prefix_(std::move(prefix)) {}

    void number(std::string_view key, double& value, Range range, std::string_view /*doc*/) {
        const auto path = prefix_ + std::string(key);
        if (const auto* given = options_.find(path)) {
            value = DescribedOptions::number(path, *given, range);
        }
    }
    template <class Whole> void whole(std::string_view key, Whole& value, Range range, std::string_view /*doc*/) {
        const auto path = prefix_ + std::string(key);
        if (const auto* given = options_.find(path)) {
            value = static_cast<Whole>(DescribedOptions::whole(path, *given, range));
        }
    }
    void flag(std::string_view key, bool& value, std::string_view /*doc*/) {
        if (const auto* given = options_.find(prefix_ + std::string(key))) {
            value = DescribedOptions::flag(*given);
        }
    }
    void text(std::string_view key, std::string& value, std::string_view /*doc*/) {
        if (const auto* given = options_.find(prefix_ + std::string(key))) {
            value = *given;
        }
    }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum& value, const Choice<Enum> (&choices)[N], std::string_view /*doc*/) {
        const auto path = prefix_ + std::string(key);
        if (const auto* given = options_.find(path)) {
            std::vector<std::string> words;
            for (const auto& each : choices) {
                words.emplace_back(each.word);
            }
            value = choices[DescribedOptions::choice(path, *given, words)].value;
        }
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view /*doc*/) {
        Applier inner(options_, prefix_ + std::string(key) + ".");
        describe(inner, value);
    }

  private:
    const DescribedOptions& options_;
    std::string prefix_;
};

template <class Struct> void DescribedOptions::declare(CLI::App& command, Struct defaults) {
    Declarer declarer(*this, command, "");
    describe(declarer, defaults);
}

template <class Struct> void DescribedOptions::apply(Struct& settings) const {
    Applier applier(*this, "");
    describe(applier, settings);
}

} // namespace millpond
