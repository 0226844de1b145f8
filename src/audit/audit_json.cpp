#include "audit/audit_text.hpp"
#include "journal/provenance.hpp"
#include "referee/referee_report.hpp"

namespace millpond {
namespace {

Json latency_json(const AuditResult& r) {
    auto rows = Json::array();
    for (const auto& row : r.latency) {
        Json json{{"part", row.part}, {"over", row.over}, {"span", row.span}, {"measured", row.figures.has_value()}};
        if (row.figures) {
            json["count"] = row.figures->count;
            json["p50_ns"] = row.figures->p50;
            json["p90_ns"] = row.figures->p90;
            json["p99_ns"] = row.figures->p99;
            json["p99.9_ns"] = row.figures->p999;
            json["max_ns"] = row.figures->max;
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
                          {"cause", name_of(state.cause)}});
    }
    auto gates = Json::array();
    for (const auto& gate : r.figures.gates) {
        gates.push_back({{"sample", gate.at.value}, {"name", gate.name}, {"open", gate.open}});
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
            {"sites", sites},
            {"notes", notes}};
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
              {"orders", counts_json<PulseOrigin>(r.figures.orders, 0)},
              {"pulses", r.figures.pulses},
              {"pulse_ends", r.figures.pulse_ends},
              {"withheld", counts_json<Rule>(r.figures.withheld, 1)}}},
            {"controls", control_json(r.controls)},
            {"score", score_json(r)},
            {"latency", latency_json(r)},
            {"stream", stream_json(r)},
            {"floors", floors_json(r)}};
}

} // namespace millpond
