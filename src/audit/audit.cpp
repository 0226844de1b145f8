#include "audit/audit.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

ShareDone progress_of(const AuditInput& input, const char* doing) {
    if (!input.progress) {
        return {};
    }
    return [&input, doing](double share) { input.progress(doing, share); };
}

RefereeFindings ask_referee(const AuditInput& input, const SessionReader& session, SampleFileReader& samples) {
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
    return referee.finish();
}

EligibleRules session_rules(const AuditInput& input, const SessionReader& session) {
    const auto detector = Detector::make(input.settings.detector, session.provenance().about.channels, session.rate());
    return {detector.filter_settle_frames(), input.settings.detector.blanking_ms, true,
            input.settings.arbiter.lockout_ms};
}

Intervals eligible_as(const AuditInput& input, const SessionReader& session, const AuditScore& known, bool as_session,
                      SampleIndex upto) {
    auto rules = session_rules(input, session);
    rules.session = as_session;
    auto eligible = eligible_time(session.events(), rules, session.rate(), SampleIndex{}, upto);
    return known.referee ? without(eligible, known.referee->artefacts.excluded) : eligible;
}

void score_all(const AuditInput& input, const SessionReader& session, const SessionFigures& figures, SampleIndex upto,
               AuditScore& known) {
    const auto score_in = [&](const Intervals& eligible) {
        return score(known.ripples, known.detections, eligible, input.labels ? 0.0 : referee_early_ms, session.rate());
    };
    const auto detector = eligible_as(input, session, known, false, upto);
    const auto as_session = eligible_as(input, session, known, true, upto);
    known.detector = score_in(detector);
    known.session = score_in(as_session);
    for (const auto& epoch : figures.epochs) {
        const Intervals there{{epoch.from, epoch.to}};
        known.epochs.push_back({score_in(intersection(detector, there)), score_in(intersection(as_session, there))});
    }
}

// Without what tells of the condition, where that is sealed.
std::vector<Event> events_to_tell(const SessionReader& session, bool blinded) {
    auto events = session.events();
    std::erase_if(events, [blinded](const Event& event) { return blinded && tells_of_condition(event.kind); });
    return events;
}

void add_conditions(const AuditInput& input, const SessionReader& session, AuditResult& result) {
    auto list = input.assignment ? input.assignment->conditions : std::vector{input.settings.arbiter.condition};
    const auto eligible =
        eligible_time(session.events(), session_rules(input, session), session.rate(), SampleIndex{}, result.end);
    result.conditions = condition_figures(session.events(), list, eligible, session.rate(), result.end);
    result.comparisons = compare_rates(result.conditions);
}

void add_score(const AuditInput& input, const SessionReader& session, AuditResult& result) {
    auto samples = session.open_samples();
    if (samples && (samples->frames() == 0 || samples->channels() != session.provenance().about.channels.size())) {
        samples.reset(); // the re-run says so
    }
    if (!input.labels && !samples) {
        result.why_no_score = "neither labels (--labels) nor stored samples for the referee";
        return;
    }
    AuditScore known;
    known.truth = input.labels ? input.labels_name : "referee";
    if (!input.labels) {
        known.referee_settings = input.referee;
        known.referee = ask_referee(input, session, *samples);
    }
    known.ripples = input.labels ? *input.labels : known.referee->ripples;
    known.detections = detections_to_score(session.events());
    known.pulses_given = result.figures.pulses > 0;
    known.pulses_scheduled = result.figures.orders[static_cast<std::size_t>(PulseOrigin::trigger)] == 0;
    const auto upto = input.labels ? result.end : std::min(result.end, SampleIndex{samples->frames()});
    score_all(input, session, result.figures, upto, known);
    result.score = std::move(known);
}

// Delayed and scheduled pulses, against the ripples that the score knows.
void add_controls(const AuditInput& input, const SessionReader& session, AuditResult& result) {
    std::optional<KnownRipples> ripples;
    if (const auto& score = result.score) {
        ripples.emplace(KnownRipples{score->ripples, score->detector.early_ms,
                                     score->referee ? score->referee->artefacts.excluded : Intervals{}});
    }
    result.controls = control_figures(session.events(), input.schedule ? &*input.schedule : nullptr,
                                      ripples ? &*ripples : nullptr, session.rate());
    if (!input.about_schedule.empty()) {
        result.controls.about_schedule = input.about_schedule;
    }
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
    result.code = input.assignment ? input.assignment->code : std::string{};
    result.blinded = input.assignment && input.assignment->conditions.empty();
    const auto events = events_to_tell(session, result.blinded);
    result.figures = session_figures(events);
    if (!result.figures.epochs.empty()) {
        auto& last = result.figures.epochs.back();
        last.to = std::max(last.from, result.end);
    }
    result.latency = latency_rows(events);
    result.rerun =
        rerun_session(session, input.settings, input.settings_name, progress_of(input, "re-run"), input.assignment);
    if (!result.blinded) {
        add_conditions(input, session, result);
    }
    add_score(input, session, result);
    add_controls(input, session, result);
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
