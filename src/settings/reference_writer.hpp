// Lists the keys of a described struct with what is allowed, the default and the meaning. Thread: control.
#pragma once

#include "base/describe.hpp"
#include "settings/yaml_writer.hpp"

#include <string>
#include <string_view>
#include <vector>

namespace millpond {

class ReferenceWriter {
  public:
    explicit ReferenceWriter(std::string prefix = {}) : prefix_(std::move(prefix)) {}

    void number(std::string_view key, double value, Range range, std::string_view doc) {
        row(key, shortest(range.least) + " to " + shortest(range.most), shortest(value), doc);
    }
    template <class Whole> void whole(std::string_view key, Whole value, Range range, std::string_view doc) {
        row(key, "whole, " + shortest(range.least) + " to " + shortest(range.most),
            std::to_string(static_cast<long long>(value)), doc);
    }
    void flag(std::string_view key, bool value, std::string_view doc) {
        row(key, "true, false", value ? "true" : "false", doc);
    }
    void text(std::string_view key, const std::string& value, std::string_view doc) {
        row(key, "text", value.empty() ? "empty" : value, doc);
    }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum value, const Choice<Enum> (&choices)[N], std::string_view doc) {
        std::string words;
        for (const auto& choice : choices) {
            words += (words.empty() ? "" : ", ") + std::string(choice.word);
        }
        row(key, words, std::string(word_for<Enum>(choices, value)), doc);
    }
    void numbers(std::string_view key, const std::vector<double>& values, Range range, std::string_view doc) {
        row(key, "list of numbers, " + shortest(range.least) + " to " + shortest(range.most),
            values.empty() ? "empty" : std::to_string(values.size()) + " numbers", doc);
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view doc) {
        row(key, "group", "", doc);
        ReferenceWriter inner(prefix_ + std::string(key) + ".");
        describe(inner, value);
        table_ += inner.table_;
    }
    template <class Struct> void list(std::string_view key, const std::vector<Struct>& values, std::string_view doc) {
        row(key, "list", values.empty() ? "empty" : std::to_string(values.size()) + " entries", doc);
        ReferenceWriter inner(prefix_ + std::string(key) + "[].");
        Struct one{};
        describe(inner, one);
        table_ += inner.table_;
    }

    /// Rows only, without the table's head.
    [[nodiscard]] const std::string& table() const noexcept { return table_; }

  private:
    void row(std::string_view key, const std::string& allowed, const std::string& standard, std::string_view doc) {
        table_ += "| `" + prefix_ + std::string(key) + "` | " + allowed + " | " + standard + " | " + std::string(doc) +
                  " |\n";
    }

    std::string prefix_;
    std::string table_;
};

} // namespace millpond
