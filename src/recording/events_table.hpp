// Events in and labels in: the tab-separated table of BIDS, `onset` and `duration` in seconds first.
// Thread: cold. Bad tables throw Refusal naming file, line and column.
#pragma once

#include <cstdint>
#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace millpond {

/// One row. `n/a` durations read as 0.
struct TableEvent {
    double onset_s = 0.0; ///< from the first sample; may be negative
    double duration_s = 0.0;
    std::string trial_type;  ///< detection, trigger, withheld, pulse, ripple, or what a person called it
    std::int64_t sample = 0; ///< round(onset * rate) where the table has no such column
    std::map<std::string, std::string> extra; ///< further columns by name
};

/// Reads rows in file order. Needs the columns onset and duration; trial_type defaults to `ripple` where the column is
/// absent.
[[nodiscard]] std::vector<TableEvent> read_events_table(const std::filesystem::path& table, double rate_hz);

/// Writes rows sorted by onset, `extra_columns` after the fixed ones (missing values as n/a). Never leaves half a file.
void write_events_table(const std::filesystem::path& table, std::vector<TableEvent> events,
                        const std::vector<std::string>& extra_columns);

} // namespace millpond
