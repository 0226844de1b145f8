// What a sweep is about to do: recordings in memory, their ripples, the settings to try. Thread: cold.
#pragma once

#include "app/tune_grid.hpp"
#include "recording/recording_reader.hpp"
#include "settings/settings.hpp"
#include "tuning/sweep.hpp"
#include "tuning/work_file.hpp"

#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace millpond {

struct TuneOptions {
    std::vector<std::filesystem::path> recordings, labels;
    std::filesystem::path base, out, referee, table, curve, grid;
    /// Keys with an option of their own; what is given on the command line, or its default.
    std::map<std::string, std::vector<std::string>> lists{
        {"filter.low_hz", {"130", "150"}},
        {"filter.high_hz", {"250"}},
        {"filter.order", {"1", "2", "3"}},
        {"envelope.smoothing_ms", {"2", "4", "8"}},
        {"threshold.deviations", {"2", "2.5", "3", "3.5", "4", "5", "6", "8"}}};
    std::vector<std::string> given_lists; ///< keys given on the command line
    double max_false_per_minute = 1.0;
    double block_s = 30.0;
    unsigned threads = 2;
    std::size_t show = 20;
    std::string part;
    bool learn = false, plain_mean = false; ///< the evidence detector instead of a sweep; without a mix of its own
    bool merge = false, resume = false, overwrite = false;
};

struct TunePlan {
    Settings base;
    TuneCandidates candidates;
    std::vector<LoadedRecording> files; ///< hold the samples
    std::vector<TuningRecording> recordings;
    SweepPlan sweep;
    WorkIdentity identity;
};

/// `3/20`. Refuses anything else.
[[nodiscard]] SweepPart part_of(const std::string& text);

/// Reads all of it. Refuses recordings of different rates, labels that do not fit, bad grids.
[[nodiscard]] TunePlan make_tune_plan(const TuneOptions& options);

} // namespace millpond
