#include "audit/audit.hpp"

#include "recording/events_table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

Progress progress_of(const AuditInput& input, const char* doing) {
    if (!input.progress) {
        return {};
    }
    return [&input, doing](double share) { input.progress(doing, share); };
}

SampleIndex place(double samples) {
    return SampleIndex{static_cast<std::uint64_t>(std::max(0.0, std::round(samples)))};
}

// Rows of type ripple; where a table calls none so, all of its rows.
Ripples read_labels(const std::filesystem::path& table, Hertz rate) {
    const auto rows = read_events_table(table, rate.value);
    const auto is_ripple = [](const TableEvent& row) { return row.trial_type == "ripple"; };
    const bool named = std::any_of(rows.begin(), rows.end(), is_ripple);
    Ripples ripples;
    for (const auto& row : rows) {
        if (!named || is_ripple(row)) {
            const auto onset = place(static_cast<double>(row.sample));
            const auto end = place(static_cast<double>(row.sample) + row.duration_s * rate.value);
            ripples.push_back({onset, onset + (end - onset) / 2, end, 0.0});
        }
    }
    std::sort(ripples.begin(), ripples.end(), [](const Ripple& a, const Ripple& b) { return a.onset < b.onset; });
    return ripples;
}

Ripples ask_referee(const AuditInput& input, const SessionReader& session, SampleFileReader& samples) {
    auto referee = Referee::make(input.referee, session.provenance().about.channels, session.rate());
    const auto progress = progress_of(input, "referee");
    std::vector<float> block(65536 / samples.channels() * samples.channels() + samples.channels());
    SampleIndex at{};
    while (const auto got = samples.read(block)) {
        referee.add({at, samples.channels(), std::span(block).first(got * samples.channels())});
        at = at + got;
        if (progress) {
            progress(static_cast<double>(at.value) / static_cast<double>(samples.frames()));
        }
    }
    return referee.finish().ripples;
}

Score score_as(const AuditInput& input, const SessionReader& session, const AuditScore& known, bool as_session,
               SampleIndex upto) {
    const auto detector = Detector::make(input.settings.detector, session.provenance().about.channels, session.rate());
    EligibleRules rules;
    rules.settle_frames = detector.filter_settle_frames();
    rules.blanking_ms = input.settings.detector.blanking_ms;
    rules.session = as_session;
    rules.lockout_ms = input.settings.arbiter.lockout_ms;
    const auto eligible = eligible_time(session.events(), rules, session.rate(), SampleIndex{}, upto);
    return score(known.ripples, known.detections, eligible, known.truth == "referee" ? referee_early_ms : 0.0,
                 session.rate());
}

void add_score(const AuditInput& input, const SessionReader& session, AuditResult& result) {
    auto samples = session.open_samples();
    if (input.labels.empty() && (!samples || samples->frames() == 0)) {
        result.why_no_score = "neither labels (--labels) nor stored samples for the referee";
        return;
    }
    AuditScore known;
    known.truth = input.labels.empty() ? "referee" : input.labels.string();
    known.ripples =
        input.labels.empty() ? ask_referee(input, session, *samples) : read_labels(input.labels, session.rate());
    known.detections = detections_to_score(session.events());
    known.pulses_given = result.figures.pulses > 0;
    const auto upto = input.labels.empty() ? std::min(result.end, SampleIndex{samples->frames()}) : result.end;
    known.detector = score_as(input, session, known, false, upto);
    known.session = score_as(input, session, known, true, upto);
    result.score = std::move(known);
}

} // namespace

AuditResult audit_session(const AuditInput& input) {
    const SessionReader session(input.session);
    AuditResult result;
    result.session = session.folder();
    result.provenance = session.provenance();
    result.cut = session.cut();
    result.records = session.events().size();
    result.torn_bytes = session.torn_bytes();
    result.damage = session.damage();
    result.end = session.end();
    if (const auto samples = session.open_samples()) {
        result.frames_stored = samples->frames();
    }
    result.figures = session_figures(session.events());
    result.latency = latency_rows(session.events());
    result.rerun = rerun_session(session, input.settings, input.settings_name, progress_of(input, "re-run"));
    add_score(input, session, result);
    return result;
}

std::vector<std::string> AuditResult::objections() const {
    std::vector<std::string> found;
    if (!damage.empty()) {
        found.push_back(fmt::format("{} damaged places in the records", damage.size()));
    }
    if (!rerun.differences.empty()) {
        found.push_back(fmt::format("{} differences between journal and re-run", rerun.differences.size()));
    }
    if (figures.dropped[0] > 0) {
        found.push_back(fmt::format("{} events dropped by the journal", figures.dropped[0]));
    }
    if (figures.dropped[1] > 0) {
        found.push_back(fmt::format("{} frames of samples dropped by the journal", figures.dropped[1]));
    }
    return found;
}

} // namespace millpond
