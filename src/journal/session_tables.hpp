// What happened in a session as a table that any spreadsheet reads: events.tsv and its dictionary events.json, as in
// BIDS. Thread: cold.
#pragma once

#include "journal/session_reader.hpp"
#include "recording/events_table.hpp"

#include <filesystem>
#include <span>
#include <string>
#include <vector>

namespace millpond {

/// Columns after the fixed ones.
[[nodiscard]] const std::vector<std::string>& session_table_columns();

/// One row for each detection, trigger, withheld, slot, omitted, order, pulse, gap, trial, site, epoch and note.
/// `blinded`: all but orders and pulses, which alone tell of a condition.
[[nodiscard]] std::vector<TableEvent> session_table(std::span<const Event> events, Hertz rate, bool blinded = false);

/// Writes events.tsv and events.json into `folder`.
void write_session_tables(const SessionReader& session, const std::filesystem::path& folder, bool blinded = false);

} // namespace millpond
