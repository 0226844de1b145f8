// An audit for people and for programs: the same figures as text, as JSON and as tables. Thread: cold.
#pragma once

#include "audit/audit.hpp"
#include "referee/score_json.hpp"

#include <filesystem>
#include <string>

namespace millpond {

[[nodiscard]] std::string audit_text(const AuditResult& result);

/// Every figure of `audit_text`, and the lists that it shortens. Null: not measured or not known.
[[nodiscard]] Json audit_json(const AuditResult& result);

/// Writes audit.json, events.tsv, events.json, ripples.tsv, schedule.tsv, latency.tsv, floors.tsv, gaps.tsv and
/// differences.tsv into `folder`. Refuses where one of them exists, unless `overwrite`.
void write_audit(const AuditResult& result, const std::filesystem::path& folder, bool overwrite);

} // namespace millpond
