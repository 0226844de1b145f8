// Truth for commands: ripples from an events table, the generator's or a person's, and the referee's rule where there
// is none. Thread: cold.
#pragma once

#include "referee/referee_settings.hpp"
#include "referee/ripple.hpp"

#include <cstdint>
#include <filesystem>
#include <string>

namespace CLI {
class App;
class Option;
} // namespace CLI

namespace millpond {

/// How a person's table is read.
struct LabelReading {
    std::string type = "ripple"; ///< rows of this trial_type are ripples
    double point_ms = 0.0;       ///< length of a row without a duration, about its onset; 0: such rows are refused
};

/// The rows of that type in order of onset, whatever the order in the table; other rows and columns are passed over.
/// Refuses a table that has rows but none of that type (and names
/// the types it has; but not one of rows that `synth` writes beside ripples), ripples without a duration unless
/// a length is given for them, ripples that overlap, and ripples that lie beyond a recording of `frames` frames: a
/// table of another recording. A ripple that ended before the first sample is not in the recording and is passed over.
[[nodiscard]] Ripples ripples_from_table(const std::filesystem::path& table, Hertz rate, std::uint64_t frames,
                                         const LabelReading& reading = {});

/// The settings of a rule by its name, or else of a file; the default rule where `rule_or_file` is empty. Refuses keys
/// that a named rule fixes, where the file gives them another value.
[[nodiscard]] RefereeSettings referee_settings_of(const std::string& rule_or_file);

/// --label-type and --point-label-ms, for commands with --labels.
void add_label_options(CLI::App& command, LabelReading& reading, CLI::Option* labels);

/// What --referee takes, for its help.
[[nodiscard]] std::string referee_help();

} // namespace millpond
