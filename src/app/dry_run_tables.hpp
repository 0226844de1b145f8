// What a dry run leaves behind: events.tsv, score.json, and a summary to read. Thread: cold.
#pragma once

#include "app/dry_run.hpp"

#include <filesystem>
#include <string>

namespace millpond {

/// Detections, triggers, withheld, gaps; a pulse for each order; the ripples of the truth; with their outcomes.
/// Outcome is n/a where the detector itself refused a detection (rules gap, unsettled, veto): it is not scored.
void write_dry_run_events(const DryRun& run, const std::filesystem::path& table);

[[nodiscard]] std::string dry_run_json(const DryRun& run);

[[nodiscard]] std::string dry_run_summary(const DryRun& run);

/// `31 of 40, 77.5 % (95 % interval 62.5 to 87.7 %)`, or `n/a`.
[[nodiscard]] std::string told(const Proportion& part);

} // namespace millpond
