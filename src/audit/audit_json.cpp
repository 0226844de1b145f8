#include "audit/audit_text.hpp"
#include "journal/provenance.hpp"
#include "referee/referee_report.hpp"

namespace millpond {
namespace {

void add_summary(Json& json, const LatencySummary& figures) {
    json["count"] = figures.count;
    json["p50_ns"] = figures.p50;
    json["p90_ns"] = figures.p90;
    json["p99_ns"] = figures.p99;
    json["p99.9_ns"] = figures.p999;
    json["max_ns"] = figures.max;
}

Json latency_json(const AuditResult& r) {
    auto rows = Json::array();
    for (const auto& row : r.latency) {
        Json json{{"part", row.part}, {"over", row.over}, {"span", row.span}, {"measured", row.figures.has_value()}};
        if (row.figures) {
            add_summary(json, *row.figures);
        }
        rows.push_back(std::move(json));
    }
    return rows;
}

Json outputs_json(const AuditResult& r) {
    auto rows = Json::array();
    for (const auto& output : r.figures.outputs) {
        Json json{{"output", output.output},
                  {"name", output.name},
                  {"marker", output.marker},
                  {"lost", output.lost},
                  {"ends", output.ends}};
        if (output.width && output.late) {
            add_summary(json["width"], *output.width);
            add_summary(json["late"], *output.late);
        }
        rows.push_back(std::move(json));
    }
    return rows;
}

template <class Code, std::size_t N>
Json counts_json(const std::array<std::uint64_t, N>& counts, std::size_t from = 0) {
    auto json = Json::object();
    for (std::size_t i = from; i < N; ++i) {
        json[std::string(name_of(static_cast<Code>(i)))] = counts[i];
    }
    return json;
}

Json event_json(const std::optional<Event>& event) {
    return event ? Json(told(*event)) : Json(nullptr);
}

Json rerun_json(const AuditResult& r) {
    auto differences = Json::array();
    for (const auto& difference : r.rerun.differences) {
        differences.push_back({{"sample", difference.at.value},
                               {"journal", event_json(difference.journaled)},
                               {"again", event_json(difference.again)},
                               {"what", difference.what}});
    }
    return {{"done", r.rerun.done},
            {"why_not", r.rerun.done ? Json(nullptr) : Json(r.rerun.why_not)},
            {"reproduced", r.rerun.reproduced()},
            {"from_sample", r.rerun.from.value},
            {"upto_sample", r.rerun.upto.value},
            {"upto_why", r.rerun.upto_why},
            {"events_compared", r.rerun.compared},
            {"decisions_compared", r.rerun.decisions},
            {"differences", differences}};
}

Json speed_json(const SpeedFigure& speed) {
    if (speed.events == 0) {
        return nullptr;
    }
    return {{"values", speed.values},
            {"kept", speed.events},
            {"least", speed.least},
            {"median", speed.median},
            {"most", speed.most}};
}

Json stream_json(const AuditResult& r) {
    const auto rate = r.provenance.about.rate;
    auto gaps = Json::array();
    for (const auto& gap : r.figures.gaps) {
        gaps.push_back({{"sample", gap.at.value},
                        {"at_s", seconds_at(gap.at, rate)},
                        {"frames", gap.frames},
                        {"cause", name_of(gap.cause)}});
    }
    auto states = Json::array();
    for (const auto& state : r.figures.states) {
        states.push_back({{"sample", state.at.value},
                          {"utc", utc_text(state.time_ns)},
                          {"before", name_of(state.before)},
                          {"after", name_of(state.after)},
                          {"cause", name_of(state.cause)},
                          {"by", told(state.by)}});
    }
    auto gates = Json::array();
    for (const auto& gate : r.figures.gates) {
        gates.push_back({{"sample", gate.at.value}, {"name", gate.name}, {"open", gate.open}, {"by", told(gate.by)}});
    }
    auto sites = Json::array();
    for (const auto& site : r.figures.sites) {
        sites.push_back({{"sample", site.at.value}, {"channel", site.channel}, {"state", name_of(site.state)}});
    }
    auto notes = Json::array();
    for (const auto& note : r.figures.notes) {
        notes.push_back({{"sample", note.sample.value}, {"utc", utc_text(note.time_ns)}, {"text", note.text}});
    }
    return {{"frames_missing", r.figures.frames_missing()},
            {"gaps", gaps},
            {"packets", counts_json<PacketCause>(r.figures.packets)},
            {"states", states},
            {"gates", gates},
            {"speed", speed_json(r.figures.speed)},
            {"sites", sites},
            {"notes", notes}};
}

Json epochs_json(const AuditResult& r) {
    const auto rate = r.provenance.about.rate;
    auto epochs = Json::array();
    for (std::size_t i = 0; i < r.figures.epochs.size(); ++i) {
        const auto& epoch = r.figures.epochs[i];
        Json json{{"index", epoch.index},
                  {"name", epoch.name},
                  {"pulses_allowed", epoch.pulses_allowed},
                  {"from_sample", epoch.from.value},
                  {"to_sample", epoch.to.value},
                  {"minutes", seconds_at(SampleIndex{epoch.to - epoch.from}, rate) / 60.0},
                  {"planned_minutes", epoch.planned_frames == 0
                                          ? Json(nullptr)
                                          : Json(seconds_at(SampleIndex{epoch.planned_frames}, rate) / 60.0)},
                  {"begun_by", told(epoch.by)},
                  {"detections", epoch.detections},
                  {"triggers", epoch.triggers},
                  {"pulses", r.blinded ? Json(nullptr) : Json(epoch.pulses)},
                  {"withheld", counts_json<Rule>(epoch.withheld, 1)}};
        json["score"] = r.score ? Json{{"detector", json_of(r.score->epochs.at(i).detector)},
                                       {"session", json_of(r.score->epochs.at(i).session)}}
                                : Json(nullptr);
        epochs.push_back(std::move(json));
    }
    return epochs;
}

Json floors_json(const AuditResult& r) {
    auto floors = Json::array();
    for (const auto& floor : r.figures.floors) {
        floors.push_back({{"site", floor.site == 65535 ? Json("mean") : Json(floor.site)},
                          {"events", floor.events},
                          {"settled_at_sample", floor.settled ? Json(floor.settled_at.value) : Json(nullptr)},
                          {"mean_least_uv", floor.mean_least},
                          {"mean_median_uv", floor.mean_median},
                          {"mean_most_uv", floor.mean_most},
                          {"mean_last_uv", floor.mean_last},
                          {"deviation_last_uv", floor.deviation_last},
                          {"threshold_last_uv", floor.threshold_last}});
    }
    return floors;
}

Json score_json(const AuditResult& r) {
    if (!r.score) {
        return {{"known", false}, {"why_not", r.why_no_score}};
    }
    const auto& about = r.provenance.about;
    return {{"known", true},
            {"truth", r.score->truth},
            {"ripples", r.score->ripples.size()},
            {"referee", r.score->referee
                            ? referee_json(r.score->referee_settings, *r.score->referee, about.channels, about.rate)
                            : Json(nullptr)},
            {"pulses_given", r.score->pulses_given},
            {"pulses_scheduled", r.score->pulses_scheduled},
            {"detector", json_of(r.score->detector)},
            {"session", json_of(r.score->session)},
            {"definitions", score_definitions()}};
}

Json conditions_json(const AuditResult& r) {
    auto all = Json::array();
    for (const auto& c : r.conditions) {
        const auto& intervals = c.trigger_intervals_s;
        all.push_back({{"condition", word_for<Condition>(conditions, c.condition)},
                       {"units", c.units},
                       {"minutes", c.minutes},
                       {"eligible_minutes", c.eligible_minutes},
                       {"detections", c.detections},
                       {"detections_per_minute", c.detections_per_minute()},
                       {"triggers", c.triggers},
                       {"catch_trials", c.catch_trials},
                       {"orders", c.orders},
                       {"pulses", c.pulses},
                       {"trigger_interval_median_s",
                        intervals.empty() ? Json(nullptr) : Json(intervals[(intervals.size() - 1) / 2])}});
    }
    return all;
}

Json comparisons_json(const AuditResult& r) {
    auto all = Json::array();
    for (const auto& pair : r.comparisons) {
        all.push_back({{"one", word_for<Condition>(conditions, pair.one)},
                       {"other", word_for<Condition>(conditions, pair.other)},
                       {"detection_rate_ratio", pair.ratio},
                       {"p", pair.p},
                       {"test", "exact conditional test of two Poisson rates (Przyborowski & Wilenski 1940)"}});
    }
    return all;
}

Json records_json(const AuditResult& r) {
    auto damage = Json::array();
    for (const auto& place : r.damage) {
        damage.push_back({{"record", place.record == UINT64_MAX ? Json("header") : Json(place.record)},
                          {"byte", place.byte},
                          {"what", place.what}});
    }
    return {{"intact", r.records},
            {"damaged", damage},
            {"torn_bytes", r.torn_bytes},
            {"dropped_events", r.figures.dropped[0]},
            {"dropped_frames", r.figures.dropped[1]},
            {"dropped_timings", r.figures.dropped[2]}};
}

} // namespace

Json audit_json(const AuditResult& r) {
    return {{"session", r.session.string()},
            {"provenance", to_json(r.provenance)},
            {"cut", r.cut},
            {"objections", r.objections()},
            {"end_sample", r.end.value},
            {"duration_s", seconds_at(r.end, r.provenance.about.rate)},
            {"frames_stored", r.frames_stored ? Json(*r.frames_stored) : Json(nullptr)},
            {"records", records_json(r)},
            {"rerun", rerun_json(r)},
            {"decisions",
             {{"detections", r.figures.detections},
              {"triggers", r.figures.triggers},
              {"catch_trials", r.figures.catch_trials},
              {"slots", counts_json<PulseOrigin>(r.figures.slots, 1)},
              {"omitted", counts_json<Rule>(r.figures.omitted, 1)},
              {"orders", r.blinded ? Json(nullptr) : counts_json<PulseOrigin>(r.figures.orders, 0)},
              {"pulses", r.blinded ? Json(nullptr) : Json(r.figures.pulses)},
              {"pulse_ends", r.blinded ? Json(nullptr) : Json(r.figures.pulse_ends)},
              {"withheld", counts_json<Rule>(r.figures.withheld, 1)}}},
            {"assignment_code", r.code.empty() ? Json(nullptr) : Json(r.code)},
            {"blinded", r.blinded},
            {"conditions", conditions_json(r)},
            {"rate_comparisons", comparisons_json(r)},
            {"controls", r.blinded ? Json(nullptr) : control_json(r.controls)},
            {"score", score_json(r)},
            {"epochs", epochs_json(r)},
            {"latency", latency_json(r)},
            {"outputs", outputs_json(r)},
            {"stream", stream_json(r)},
            {"floors", floors_json(r)}};
}

} // namespace millpond
