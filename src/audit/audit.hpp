// The audit of a session: what happened, how fast, how right, and whether the engine decides the same again.
// Thread: cold.
#pragma once

#include "audit/condition_figures.hpp"
#include "audit/control_figures.hpp"
#include "audit/latency_figures.hpp"
#include "audit/rerun.hpp"
#include "audit/session_figures.hpp"
#include "referee/referee.hpp"
#include "referee/scoring.hpp"

#include <filesystem>
#include <functional>
#include <optional>
#include <string>
#include <vector>

namespace millpond {

struct AuditInput {
    std::filesystem::path session;
    EngineSettings settings;                     ///< as the session used them
    std::string settings_name;                   ///< for messages: the file they came from
    std::optional<SessionAssignment> assignment; ///< where a list said the condition; sealed: without conditions
    std::optional<Ripples> labels;               ///< empty: the referee over the stored samples is the truth
    std::string labels_name;                     ///< the table that they came from
    RefereeSettings referee;
    std::optional<Schedule> schedule; ///< places of the schedule's file; empty: none, or it cannot be read
    std::string about_schedule;       ///< why it cannot be read
    /// Told now and then what is being done and its share, 0 to 1.
    std::function<void(const char* doing, double share)> progress;
};

/// One epoch's share of the two readings below.
struct EpochScore {
    Score detector, session;
};

/// Detections against ripples, read in two ways (see referee/eligible_time.hpp).
struct AuditScore {
    std::string truth; ///< the table's name, or "referee"
    Ripples ripples;
    std::optional<RefereeFindings> referee; ///< its ripples are the ones above; empty: labels
    RefereeSettings referee_settings;
    std::vector<SampleIndex> detections;
    Score detector;                 ///< over all time in which the detector was fit to detect
    Score session;                  ///< over the time in which a trigger was possible
    std::vector<EpochScore> epochs; ///< as figures.epochs: of ripples and detections in each
    bool pulses_given = false;      ///< pulses change the very signal that the truth is taken from
    bool pulses_scheduled = false;  ///< by delay or by a control schedule: they did not follow detections at once
};

struct AuditResult {
    std::filesystem::path session;
    /// Sealed, and not unblinded: what follows tells nothing of pulses.
    bool blinded = false;
    std::string code;                         ///< of the session in its list; empty without one
    std::vector<ConditionFigures> conditions; ///< in order of first appearance; empty where blinded
    std::vector<RateComparison> comparisons;  ///< of every two of them
    Provenance provenance;
    bool cut = false;
    std::uint64_t records = 0; ///< intact ones
    std::uint64_t torn_bytes = 0;
    std::vector<RecordDamage> damage;
    SampleIndex end;
    std::optional<std::uint64_t> frames_stored; ///< empty: the session stored none
    SessionFigures figures;
    ControlFigures controls;
    std::vector<LatencyRow> latency;
    Rerun rerun;
    std::optional<AuditScore> score;
    std::string why_no_score;

    /// What speaks against the session, one line each; empty: decisions reproduced as far as they could be re-run, all
    /// records intact, nothing dropped.
    [[nodiscard]] std::vector<std::string> objections() const;
};

/// Refuses what is no session, and settings or labels that do not fit it.
[[nodiscard]] AuditResult audit_session(const AuditInput& input);

} // namespace millpond
