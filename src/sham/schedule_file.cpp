#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "sham/schedule.hpp"

#include <fmt/format.h>

#include <cmath>

namespace millpond {

Schedule read_schedule(const std::filesystem::path& table, Hertz rate) {
    Schedule schedule;
    std::size_t line = 1;
    for (const auto& event : read_events_table(table, rate.value)) {
        const auto where = fmt::format("{}:{}", table.string(), ++line);
        if (event.trial_type != "scheduled") {
            throw Refusal(where + ": trial_type", "'" + event.trial_type + "'",
                          "'scheduled', as millpond sham writes it: a schedule holds nothing else");
        }
        if (!(event.onset_s >= 0.0)) {
            throw Refusal(where + ": onset", fmt::format("{}", event.onset_s), "0 or more seconds");
        }
        if (std::abs(static_cast<double>(event.sample) - event.onset_s * rate.value) > 1.0) {
            throw Refusal(where + ": sample", fmt::format("{} for {} s", event.sample, event.onset_s),
                          fmt::format("a schedule made for this stream, {} Hz", rate.value));
        }
        const SampleIndex at{static_cast<std::uint64_t>(event.sample)};
        if (!schedule.empty() && at <= schedule.back()) {
            throw Refusal(where + ": onset", fmt::format("{} s, not after the one before", event.onset_s),
                          "places in ascending order, each once");
        }
        schedule.push_back(at);
    }
    return schedule;
}

void write_schedule(const std::filesystem::path& table, const Schedule& schedule, Hertz rate) {
    std::vector<TableEvent> events;
    for (const auto at : schedule) {
        events.push_back({seconds_at(at, rate), 0.0, "scheduled", static_cast<std::int64_t>(at.value), {}});
    }
    write_events_table(table, std::move(events), {});
}

} // namespace millpond
