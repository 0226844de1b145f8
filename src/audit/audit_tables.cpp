#include "audit/audit_text.hpp"
#include "base/refusal.hpp"
#include "journal/session_tables.hpp"
#include "recording/whole_file.hpp"

#include <fmt/format.h>

#include <array>

namespace millpond {
namespace {

constexpr std::array outputs{"audit.json",  "events.tsv", "events.json", "ripples.tsv",    "schedule.tsv",
                             "latency.tsv", "floors.tsv", "gaps.tsv",    "differences.tsv"};

std::string latency_table(const AuditResult& r) {
    std::string text = "part\tover\tcount\tp50_ns\tp90_ns\tp99_ns\tp99.9_ns\tmax_ns\n";
    for (const auto& row : r.latency) {
        text += fmt::format("{}\t{}\t", row.part, row.over);
        text += row.figures ? fmt::format("{}\t{}\t{}\t{}\t{}\t{}\n", row.figures->count, row.figures->p50,
                                          row.figures->p90, row.figures->p99, row.figures->p999, row.figures->max)
                            : "0\tn/a\tn/a\tn/a\tn/a\tn/a\n";
    }
    return text;
}

std::string floors_table(const SessionReader& session) {
    std::string text = "onset\tduration\tsample\tsite\tmean_uv\tdeviation_uv\tthreshold_uv\tsettled\tframes\n";
    for (const auto& event : session.events()) {
        if (event.kind == EventKind::floor) {
            const auto floor = event.as<FloorDetail>();
            text += fmt::format("{}\t0\t{}\t{}\t{}\t{}\t{}\t{}\t{}\n", seconds_at(event.sample, session.rate()),
                                event.sample.value, floor.site == 65535 ? "mean" : fmt::format("{}", floor.site),
                                floor.mean, floor.deviation, floor.threshold, floor.settled, floor.frames);
        }
    }
    return text;
}

std::string gaps_table(const AuditResult& r) {
    const auto rate = r.provenance.about.rate;
    std::string text = "onset\tduration\tsample\tframes\tcause\n";
    for (const auto& gap : r.figures.gaps) {
        text += fmt::format("{}\t{}\t{}\t{}\t{}\n", seconds_at(gap.at, rate),
                            static_cast<double>(gap.frames) / rate.value, gap.at.value, gap.frames, name_of(gap.cause));
    }
    return text;
}

std::string differences_table(const AuditResult& r) {
    std::string text = "sample\tjournal\tre-run\n";
    for (const auto& difference : r.rerun.differences) {
        text +=
            fmt::format("{}\t{}\t{}\n", difference.at.value, difference.journaled ? told(*difference.journaled) : "n/a",
                        difference.again ? told(*difference.again) : "n/a");
    }
    return text;
}

void write_ripples(const AuditResult& r, const std::filesystem::path& table) {
    const auto rate = r.provenance.about.rate;
    std::vector<TableEvent> rows;
    for (std::size_t i = 0; i < r.score->ripples.size(); ++i) {
        const auto& ripple = r.score->ripples[i];
        TableEvent row;
        row.onset_s = seconds_at(ripple.onset, rate);
        row.duration_s = static_cast<double>(ripple.end - ripple.onset) / rate.value;
        row.trial_type = "ripple";
        row.sample = static_cast<std::int64_t>(ripple.onset.value);
        row.extra["detector"] = name_of(r.score->detector.ripples.at(i));
        row.extra["session"] = name_of(r.score->session.ripples.at(i));
        rows.push_back(std::move(row));
    }
    write_events_table(table, std::move(rows), {"detector", "session"});
}

} // namespace

void write_audit(const AuditResult& r, const std::filesystem::path& folder, bool overwrite) {
    for (const auto* name : outputs) {
        if (!overwrite && std::filesystem::exists(folder / name)) {
            throw Refusal((folder / name).string(), "a file",
                          "a folder without the output of an audit, or --overwrite");
        }
    }
    std::error_code trouble;
    std::filesystem::create_directories(folder, trouble);
    if (trouble) {
        throw Refusal(folder.string(), trouble.message(), "a folder that can be made and written");
    }
    const SessionReader session(r.session);
    write_session_tables(session, folder, r.blinded);
    if (r.score) {
        write_ripples(r, folder / "ripples.tsv");
    }
    write_whole_file(folder / "latency.tsv", latency_table(r));
    write_whole_file(folder / "floors.tsv", floors_table(session));
    write_whole_file(folder / "gaps.tsv", gaps_table(r));
    write_whole_file(folder / "schedule.tsv",
                     control_table(r.blinded ? ControlFigures{} : r.controls, r.provenance.about.rate));
    write_whole_file(folder / "differences.tsv", differences_table(r));
    write_whole_file(folder / "audit.json", audit_json(r).dump(2) + "\n"); // last: where it is, the rest is whole
}

} // namespace millpond
