#include "recording/events_table.hpp"

#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <optional>
#include <string_view>

namespace millpond {
namespace {

constexpr std::string_view not_applicable = "n/a";

std::vector<std::string_view> split(std::string_view text, char at) {
    std::vector<std::string_view> parts;
    for (std::size_t from = 0;;) {
        const auto to = text.find(at, from);
        parts.push_back(text.substr(from, to - from));
        if (to == std::string_view::npos) {
            return parts;
        }
        from = to + 1;
    }
}

template <class Number> std::optional<Number> number_in(std::string_view text) {
    Number value{};
    const auto end = text.data() + text.size();
    const auto [stopped, error] = std::from_chars(text.data(), end, value);
    return error == std::errc{} && stopped == end ? std::optional(value) : std::nullopt;
}

/// The columns of one table, and where in it the reader is, for messages.
class Table {
  public:
    Table(std::string file, std::string_view header) : file_(std::move(file)), columns_(split(header, '\t')) {
        for (const auto needed : {"onset", "duration"}) {
            if (std::count(columns_.begin(), columns_.end(), needed) == 0) {
                throw Refusal(file_ + ":1", fmt::format("no column {}", needed),
                              "tab-separated columns with onset and duration among them");
            }
        }
        for (const auto column : columns_) {
            if (column.empty() || std::count(columns_.begin(), columns_.end(), column) > 1) {
                throw Refusal(file_ + ":1", fmt::format("column name '{}' {}", column, column.empty() ? "" : "twice"),
                              "each column with a name of its own");
            }
        }
    }

    TableEvent event(std::string_view line, std::size_t number, double rate_hz) const {
        const auto values = split(line, '\t');
        if (values.size() != columns_.size()) {
            throw Refusal(fmt::format("{}:{}", file_, number), fmt::format("{} columns", values.size()),
                          fmt::format("{} columns as in the first line", columns_.size()));
        }
        TableEvent event;
        event.trial_type = "ripple";
        std::optional<std::int64_t> sample;
        for (std::size_t i = 0; i < values.size(); ++i) {
            take(event, sample, columns_[i], values[i], fmt::format("{}:{}: {}", file_, number, columns_[i]));
        }
        event.sample = sample ? *sample : std::llround(event.onset_s * rate_hz);
        return event;
    }

  private:
    static void take(TableEvent& event, std::optional<std::int64_t>& sample, std::string_view column,
                     std::string_view value, const std::string& where) {
        if (column == "onset") {
            event.onset_s = seconds(value, -1e9, "seconds from the first sample", where);
        } else if (column == "duration") {
            event.duration_s = value == not_applicable ? 0.0 : seconds(value, 0.0, "seconds, 0 or more, or n/a", where);
        } else if (column == "trial_type") {
            event.trial_type = value;
        } else if (column == "sample") {
            if (value != not_applicable && !(sample = number_in<std::int64_t>(value))) {
                throw Refusal(where, fmt::format("'{}'", value), "a whole number of samples, or n/a");
            }
        } else if (value != not_applicable) {
            event.extra.emplace(column, value);
        }
    }

    static double seconds(std::string_view value, double least, const char* allowed, const std::string& where) {
        const auto read = number_in<double>(value);
        if (!read || !(*read >= least && *read <= 1e9)) {
            throw Refusal(where, fmt::format("'{}'", value), allowed);
        }
        return *read;
    }

    std::string file_;
    std::vector<std::string_view> columns_;
};

void append_value(std::string& text, std::string_view value, const std::string& where) {
    if (value.find_first_of("\t\r\n") != std::string_view::npos) {
        throw Refusal(where, fmt::format("a tab or line break in '{}'", value), "values of one line without tabs");
    }
    text += '\t';
    text += value.empty() ? not_applicable : value;
}

} // namespace

std::vector<TableEvent> read_events_table(const std::filesystem::path& table, double rate_hz) {
    const auto content = read_whole_file(table);
    std::string_view text = content;
    if (text.starts_with("\xEF\xBB\xBF")) {
        text.remove_prefix(3); // spreadsheets put a byte order mark in front
    }
    auto lines = split(text, '\n');
    for (auto& line : lines) {
        if (line.ends_with('\r')) {
            line.remove_suffix(1);
        }
    }
    if (lines.size() > 1 && lines.back().empty()) {
        lines.pop_back();
    }
    const Table columns(table.string(), lines.front());
    std::vector<TableEvent> events;
    for (std::size_t i = 1; i < lines.size(); ++i) {
        events.push_back(columns.event(lines[i], i + 1, rate_hz));
    }
    return events;
}

void write_events_table(const std::filesystem::path& table, std::vector<TableEvent> events,
                        const std::vector<std::string>& extra_columns) {
    std::stable_sort(events.begin(), events.end(),
                     [](const TableEvent& a, const TableEvent& b) { return a.onset_s < b.onset_s; });
    std::string text = "onset\tduration\ttrial_type\tsample";
    for (const auto& column : extra_columns) {
        append_value(text, column, table.string());
    }
    for (const auto& event : events) {
        text += fmt::format("\n{}\t{}", event.onset_s, event.duration_s);
        append_value(text, event.trial_type, table.string());
        text += fmt::format("\t{}", event.sample);
        for (const auto& column : extra_columns) {
            const auto found = event.extra.find(column);
            append_value(text, found == event.extra.end() ? std::string_view{} : found->second, table.string());
        }
    }
    write_whole_file(table, text + "\n");
}

} // namespace millpond
