#include "app/dry_run_tables.hpp"

#include "journal/session_tables.hpp"
#include "recording/whole_file.hpp"
#include "referee/referee_report.hpp"
#include "referee/score_json.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::string figure(double value, int decimals = 1) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : "n/a";
}

// Both lists ascend: the scored detections are some of the table's rows.
void add_outcomes(std::vector<TableEvent>& rows, const std::vector<SampleIndex>& scored, const Score& score) {
    std::size_t next = 0;
    for (auto& row : rows) {
        if (row.trial_type == "detection" && next < scored.size() &&
            static_cast<std::uint64_t>(row.sample) == scored[next].value) {
            row.extra["outcome"] = name_of(score.detections[next]);
            ++next;
        }
    }
}

void add_deviations(std::vector<TableEvent>& rows, const std::vector<Event>& events) {
    auto row = rows.begin();
    for (const auto& event : events) {
        if (event.kind != EventKind::detection) {
            continue;
        }
        row = std::find_if(row, rows.end(), [](const TableEvent& each) { return each.trial_type == "detection"; });
        row->extra["deviation_uv"] = fmt::format("{}", event.as<DetectionDetail>().deviation);
        ++row;
    }
}

TableEvent pulse_row(const Event& order, const DryRun& run) {
    return {seconds_at(order.sample, run.rate),
            run.pulse_width_ms / 1000.0,
            "pulse",
            static_cast<std::int64_t>(order.sample.value),
            {}};
}

TableEvent ripple_row(const Ripple& ripple, RippleOutcome outcome, Hertz rate) {
    TableEvent row{seconds_at(ripple.onset, rate),
                   seconds_at(SampleIndex{ripple.end - ripple.onset}, rate),
                   "ripple",
                   static_cast<std::int64_t>(ripple.onset.value),
                   {}};
    row.extra["outcome"] = name_of(outcome);
    if (ripple.peak_envelope > 0.0) {
        row.extra["envelope_uv"] = fmt::format("{:.2f}", ripple.peak_envelope);
    }
    return row;
}

std::uint64_t count_of(const DryRun& run, EventKind kind) {
    return static_cast<std::uint64_t>(
        std::count_if(run.events.begin(), run.events.end(), [&](const Event& event) { return event.kind == kind; }));
}

Json withheld_json(const DryRun& run) {
    Json rules = Json::object();
    for (std::size_t rule = 1; rule < rule_count; ++rule) {
        rules[std::string(name_of(static_cast<Rule>(rule)))] = run.withheld[rule];
    }
    return rules;
}

Json truth_json(const DryRun& run) {
    Json truth{{"from", run.truth}, {"ripples", run.findings.ripples.size()}};
    if (run.referee_settings) {
        truth["referee"] = referee_json(*run.referee_settings, run.findings, run.channels, run.rate);
    }
    return truth;
}

std::string withheld_lines(const DryRun& run) {
    std::string text;
    for (std::size_t rule = 1; rule < rule_count; ++rule) {
        if (run.withheld[rule] > 0) {
            text +=
                fmt::format("  withheld        {}, rule {}\n", run.withheld[rule], name_of(static_cast<Rule>(rule)));
        }
    }
    return text;
}

std::string truth_lines(const DryRun& run) {
    const auto by = run.referee_settings ? ", rule " + rule_text(*run.referee_settings) : std::string{};
    std::string text = fmt::format("  truth           {}{}, {} ripples, early {} ms\n", run.truth, by,
                                   run.findings.ripples.size(), run.score.early_ms);
    if (run.referee_settings) {
        text += fmt::format("  artefacts       {}\n",
                            artefacts_text(*run.referee_settings, run.findings, run.channels, run.rate));
    }
    return text;
}

} // namespace

std::string told(const Proportion& part) {
    return part.of == 0 ? "n/a"
                        : fmt::format("{} of {}, {:.1f} % (95 % interval {:.1f} to {:.1f} %)", part.count, part.of,
                                      100.0 * part.share, 100.0 * part.low, 100.0 * part.high);
}

void write_dry_run_events(const DryRun& run, const std::filesystem::path& table) {
    auto rows = session_table(run.events, run.rate);
    add_outcomes(rows, detections_to_score(run.events), run.score);
    add_deviations(rows, run.events);
    for (const auto& order : run.orders) {
        rows.push_back(pulse_row(order, run));
    }
    for (std::size_t i = 0; i < run.findings.ripples.size(); ++i) {
        rows.push_back(ripple_row(run.findings.ripples[i], run.score.ripples[i], run.rate));
    }
    write_events_table(table, std::move(rows),
                       {"rule", "cause", "number", "origin", "from", "catch", "site", "votes", "envelope_uv",
                        "floor_uv", "deviation_uv", "threshold_uv", "outcome"});
}

std::string dry_run_json(const DryRun& run) {
    Json channels = Json::array();
    for (const auto& channel : run.channels) {
        channels.push_back({{"name", channel.name}, {"role", word_for<ChannelRole>(channel_roles, channel.role)}});
    }
    Json json{{"recording", run.recording},
              {"format", run.format},
              {"rate_hz", run.rate.value},
              {"frames", run.frames},
              {"channels", channels},
              {"settings_fnv1a64", run.settings_hash},
              {"armed", run.armed},
              {"filter_delay_ms", run.filter_delay_ms},
              {"delay_ms", run.delay_ms},
              {"detections", count_of(run, EventKind::detection)},
              {"triggers", count_of(run, EventKind::trigger)},
              {"pulses", run.orders.size()},
              {"withheld", withheld_json(run)},
              {"gaps", run.gaps},
              {"gap_frames", run.gap_frames},
              {"truth", truth_json(run)},
              {"score", json_of(run.score)},
              {"definitions", score_definitions()}};
    if (run.agreement) {
        json["agreement"] = agreement_json(*run.agreement, run.rate);
    }
    return json.dump(2) + "\n";
}

std::string dry_run_summary(const DryRun& run) {
    const auto& score = run.score;
    const auto& latency = score.onset_latency_ms;
    std::string text =
        fmt::format("{}: {:.1f} s, {} channels at {} Hz, {:.0f} times real pace\n", run.recording,
                    seconds_at(SampleIndex{run.frames}, run.rate), run.channels.size(), run.rate.value, run.real_pace);
    text +=
        fmt::format("  delay           filter {:.2f} ms, with smoother {:.2f} ms\n", run.filter_delay_ms, run.delay_ms);
    text += fmt::format("  detections      {}\n  triggers        {}\n", count_of(run, EventKind::detection),
                        count_of(run, EventKind::trigger));
    text += withheld_lines(run);
    if (run.gaps > 0) {
        text += fmt::format("  gaps            {}, {} frames\n", run.gaps, run.gap_frames);
    }
    text += truth_lines(run);
    text +=
        fmt::format("  eligible        {:.2f} minutes, {} ripples\n", score.eligible_minutes, score.eligible_ripples);
    text += fmt::format("  hit rate        {}\n  precision       {}\n", told(score.hit_rate), told(score.precision));
    text +=
        fmt::format("  false           {}, {} per minute\n", score.false_detections, figure(score.false_per_minute, 2));
    text += fmt::format("  onset latency   median {} ms (quartiles {} to {}, p90 {}, p99 {})\n", figure(latency.median),
                        figure(latency.quartile1), figure(latency.quartile3), figure(latency.p90), figure(latency.p99));
    text += fmt::format("  elapsed share   median {}; before half: {}\n", figure(score.elapsed_share.median, 2),
                        told(score.before_half));
    return text;
}

} // namespace millpond
