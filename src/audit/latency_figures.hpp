// How long each part of the closed loop took. A part that was not measured has no figures. Thread: cold.
#pragma once

#include "base/event.hpp"

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace millpond {

/// ns. Over pulses: exact, nearest rank (smallest value with at least that share at or below it). Over packets: from
/// the session's histograms, the upper end of a bin 3 % wide.
struct LatencySummary {
    std::uint64_t count = 0;
    std::int64_t p50 = 0, p90 = 0, p99 = 0, p999 = 0, max = 0;

    bool operator==(const LatencySummary&) const = default;
};

struct LatencyRow {
    std::string part;                      ///< packing, transport, wake, compute, output, line, loop, pulse end
    std::string over;                      ///< "pulses" or "packets"
    std::string span;                      ///< from what to what
    std::optional<LatencySummary> figures; ///< empty: not measured
};

[[nodiscard]] std::vector<LatencyRow> latency_rows(std::span<const Event> events);

/// Empty for no values.
[[nodiscard]] std::optional<LatencySummary> summary_of(std::vector<std::int64_t> values_ns);

} // namespace millpond
