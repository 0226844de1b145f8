// What a control schedule stands for: the pulses, or else the triggers, of a session or dry run. Thread: cold.
#pragma once

#include "sham/schedule.hpp"

#include <filesystem>
#include <map>
#include <optional>
#include <string>

namespace millpond {

struct ShamSource {
    std::string name;     ///< folder or table, as given
    bool session = false; ///< a session folder; else an events table
    Hertz rate;
    Schedule places;                  ///< ascending
    bool sealed = false;              ///< not unblinded: its orders would tell its condition, so triggers are taken
    bool given = false;               ///< places are those of orders: pulses that were given; else of triggers
    SampleIndex first;                ///< the first sample
    std::optional<SampleIndex> armed; ///< when it was first armed; empty: never, or a table
    std::map<std::string, SampleIndex> epochs; ///< starts by name; of a name that comes twice, the first

    /// `27 orders: the pulses that were given`
    [[nodiscard]] std::string told() const;
};

/// `said`: the rate as the user said it, `where` for the message; a session folder says its own. Refuses a table
/// without a rate, a rate that is not the session's, and a source without orders and triggers.
[[nodiscard]] ShamSource read_sham_source(const std::filesystem::path& source, std::optional<Hertz> said,
                                          const std::string& where);

/// `first`, `armed`, or the name of an epoch. Refuses what the source does not have and says what it has.
[[nodiscard]] SampleIndex moment_of(const ShamSource& source, const std::string& align);

} // namespace millpond
