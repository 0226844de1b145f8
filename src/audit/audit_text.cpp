#include "audit/audit_text.hpp"

#include "referee/referee_report.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

constexpr std::size_t most_listed = 10;

std::string at_text(SampleIndex at, Hertz rate) {
    return fmt::format("{:.3f} s (sample {})", seconds_at(at, rate), at.value);
}

std::string micros(std::int64_t ns) {
    return fmt::format("{:.1f}", static_cast<double>(ns) / 1000.0);
}

std::string figure(double value, int digits = 2) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, digits) : "not known";
}

std::string share(const Proportion& part) {
    if (part.of == 0) {
        return "not known (0 of 0)";
    }
    return fmt::format("{:.1f} % ({} of {}; 95 %: {:.1f} to {:.1f} %)", 100 * part.share, part.count, part.of,
                       100 * part.low, 100 * part.high);
}

std::string site_text(std::uint16_t site, const AuditResult& result) {
    const auto& channels = result.provenance.about.channels;
    return site == 65535 ? "sites together" : site < channels.size() ? channels[site].name : fmt::format("{}", site);
}

// One line each, the first few of many.
template <class Items, class Line> std::string listed(const Items& items, Line line) {
    std::string text;
    for (std::size_t i = 0; i < std::min(items.size(), most_listed); ++i) {
        text += "  " + line(items[i]) + "\n";
    }
    if (items.size() > most_listed) {
        text += fmt::format("  ... and {} more (all of them: --json or --out)\n", items.size() - most_listed);
    }
    return text;
}

std::string head(const AuditResult& r) {
    const auto& about = r.provenance.about;
    auto text = fmt::format("Session {}\n", r.session.string());
    text += fmt::format("  {} on {} ({}, {}), clock {}\n", about.program, r.provenance.machine, r.provenance.cpu,
                        r.provenance.kernel, r.provenance.clock_source);
    text += fmt::format("  began {}, {} channels at {} Hz, {:.1f} s of stream\n", utc_text(r.provenance.start_utc_ns),
                        about.channels.size(), about.rate.value, seconds_at(r.end, about.rate));
    text += fmt::format("  detector delay {:.2f} ms at the band's centre, band-pass alone {:.2f} ms\n",
                        1000 * about.delay_samples / about.rate.value,
                        1000 * about.filter_delay_samples / about.rate.value);
    text += r.cut ? "  CUT: the session never came to its end; what follows is what was written until then\n"
                  : "  closed\n";
    text += fmt::format("  {} intact records, {} damaged", r.records, r.damage.size());
    text += r.torn_bytes > 0 ? fmt::format(", the last one torn ({} bytes of it)\n", r.torn_bytes) : "\n";
    text += listed(r.damage, [](const RecordDamage& damage) {
        return damage.record == UINT64_MAX
                   ? damage.what
                   : fmt::format("record {} (byte {}): {}", damage.record, damage.byte, damage.what);
    });
    text +=
        r.frames_stored ? fmt::format("  {} frames of samples stored\n", *r.frames_stored) : "  no samples stored\n";
    return text;
}

// What the settings said of the stimulus and of the speed's delay.
std::string stated_text(const AuditResult& r) {
    const auto& more = r.provenance.about.more;
    std::string text;
    if (more.contains("stimulus")) {
        text += "\nStimulus, as stated in the settings\n  " + more.at("stimulus").value("text", "") + "\n";
        for (const auto& warning : more.at("stimulus").value("warnings", std::vector<std::string>{})) {
            text += "  caution: " + warning + "\n";
        }
    }
    if (more.contains("speed_gate_delay_ms")) {
        text += fmt::format("\nSpeed gate\n  its speeds were {:g} ms late, as stated in the settings; nothing was "
                            "corrected for that\n",
                            more.value("speed_gate_delay_ms", 0.0));
    }
    return text;
}

std::string rerun_text(const AuditResult& r) {
    if (!r.rerun.done) {
        return fmt::format("\nRe-run\n  not done: {}\n", r.rerun.why_not);
    }
    auto text = fmt::format("\nRe-run\n  {} events compared, {} decisions among them, up to {}: {}\n", r.rerun.compared,
                            r.rerun.decisions, at_text(r.rerun.upto, r.provenance.about.rate), r.rerun.upto_why);
    text += r.rerun.reproduced() ? "  every decision reproduced\n"
                                 : fmt::format("  {} DIFFERENCES\n", r.rerun.differences.size());
    return text + listed(r.rerun.differences, [](const Difference& difference) { return difference.what; });
}

std::string latency_text(const AuditResult& r) {
    auto text = fmt::format("\nLatency by part, us\n  {:<10} {:<8} {:>8} {:>9} {:>9} {:>9} {:>9} {:>9}  {}\n", "part",
                            "over", "count", "p50", "p90", "p99", "p99.9", "max", "from what to what");
    for (const auto& row : r.latency) {
        text += row.figures ? fmt::format("  {:<10} {:<8} {:>8} {:>9} {:>9} {:>9} {:>9} {:>9}  {}\n", row.part,
                                          row.over, row.figures->count, micros(row.figures->p50),
                                          micros(row.figures->p90), micros(row.figures->p99), micros(row.figures->p999),
                                          micros(row.figures->max), row.span)
                            : fmt::format("  {:<10} {:<8} {:>58}  {}\n", row.part, row.over, "not measured", row.span);
    }
    return text + "  over pulses: exact, nearest rank; over packets: upper end of a bin 3 % wide\n";
}

std::string one_score(const char* reading, const Score& s) {
    return fmt::format("  {}: {:.2f} eligible minutes\n"
                       "    hits {}, misses {}, false {}, repeats {}, outside {}\n"
                       "    hit rate {}\n    precision {}\n    false per minute {}\n"
                       "    onset latency, ms: median {}, quartiles {} to {}, p90 {}, p99 {}\n"
                       "    before half of the ripple: {}\n",
                       reading, s.eligible_minutes, s.hits, s.misses, s.false_detections, s.repeats, s.outside,
                       share(s.hit_rate), share(s.precision), figure(s.false_per_minute),
                       figure(s.onset_latency_ms.median, 1), figure(s.onset_latency_ms.quartile1, 1),
                       figure(s.onset_latency_ms.quartile3, 1), figure(s.onset_latency_ms.p90, 1),
                       figure(s.onset_latency_ms.p99, 1), share(s.before_half));
}

std::string score_text(const AuditResult& r) {
    if (!r.score) {
        return fmt::format("\nDetections against ripples\n  not known: {}\n", r.why_no_score);
    }
    auto text = fmt::format("\nDetections against ripples ({}: {} ripples; early {} ms)\n", r.score->truth,
                            r.score->ripples.size(), r.score->detector.early_ms);
    if (r.score->referee) {
        text += fmt::format("  {:<20} {}\n  {:<20} {}\n", "rule", rule_text(r.score->referee_settings), "artefacts",
                            artefacts_text(r.score->referee_settings, *r.score->referee, r.provenance.about.channels,
                                           r.provenance.about.rate));
    }
    text += one_score("detector, while it was fit to detect", r.score->detector);
    text += one_score("session, while a trigger was possible", r.score->session);
    if (r.score->pulses_given) {
        text +=
            r.score->pulses_scheduled
                ? "  Delayed or scheduled pulses were given: they change the signal where they fell, ripple or not.\n"
                : "  Pulses were given: they change the signal that the truth is taken from. Estimate hit and false\n"
                  "  rates from control sessions.\n";
    }
    return text;
}

template <std::size_t N, class Code> std::string counted(const std::array<std::uint64_t, N>& counts) {
    std::string text;
    for (std::size_t i = 0; i < N; ++i) {
        if (counts[i] > 0) {
            text += fmt::format("  {:<20} {}\n", name_of(static_cast<Code>(i)), counts[i]);
        }
    }
    return text.empty() ? "  none\n" : text;
}

std::string decisions_text(const AuditResult& r) {
    const auto& f = r.figures;
    auto text = fmt::format("\nDecisions\n  {} detections, {} triggers ({} catch trials)\n", f.detections, f.triggers,
                            f.catch_trials);
    text += r.blinded ? std::string("  pulses are not told: the condition is sealed (millpond unblind)\n")
                      : fmt::format("  {} pulses, {} pulse ends\n  orders at triggers {}, delayed {}, scheduled {}\n",
                                    f.pulses, f.pulse_ends, f.orders[0], f.orders[2], f.orders[1]);
    if (f.slots[1] + f.slots[2] > 0) {
        text +=
            fmt::format("  moments for pulses a while after triggers {}, of a schedule {}\n", f.slots[2], f.slots[1]);
    }
    text += "\nWithheld by rule\n" + counted<rule_count, Rule>(f.withheld);
    text += "\nMoments omitted by rule\n" + counted<rule_count, Rule>(f.omitted);
    text += "\nPackets by cause\n" + counted<packet_cause_count, PacketCause>(f.packets);
    return text;
}

std::string conditions_text(const AuditResult& r) {
    auto text = fmt::format("\nConditions{}\n", r.code.empty() ? "" : ", session " + r.code + " of its list");
    if (r.blinded) {
        return text + "  sealed\n";
    }
    text += fmt::format("  {:<13} {:>6} {:>9} {:>9} {:>11} {:>11} {:>9} {:>7} {:>7}\n", "condition", "units", "minutes",
                        "eligible", "detections", "per minute", "triggers", "catch", "pulses");
    for (const auto& c : r.conditions) {
        text += fmt::format("  {:<13} {:>6} {:>9.2f} {:>9.2f} {:>11} {:>11} {:>9} {:>7} {:>7}\n",
                            word_for<Condition>(conditions, c.condition), c.units, c.minutes, c.eligible_minutes,
                            c.detections, figure(c.detections_per_minute()), c.triggers, c.catch_trials, c.pulses);
    }
    for (const auto& pair : r.comparisons) {
        text +=
            fmt::format("  {} over {}: {} times as many detections an eligible minute, p = {:.3f} (exact conditional "
                        "test of two Poisson rates)\n",
                        word_for<Condition>(conditions, pair.one), word_for<Condition>(conditions, pair.other),
                        figure(pair.ratio), pair.p);
    }
    return text;
}

std::string outputs_text(const AuditResult& r) {
    std::string text = "\nOutputs, us by this computer's clock\n";
    for (const auto& output : r.figures.outputs) {
        text += fmt::format("  {} ({}): {} {} ended, device lost {} times", output.name, output.output, output.ends,
                            output.marker ? "markers" : "pulses", output.lost);
        if (output.width && output.late) {
            text += fmt::format("; width median {}, most {}; fall late by median {}, p99 {}, most {}",
                                micros(output.width->p50), micros(output.width->max), micros(output.late->p50),
                                micros(output.late->p99), micros(output.late->max));
        }
        text += "\n";
    }
    return r.figures.outputs.empty() ? text + "  none\n" : text;
}

std::string stream_text(const AuditResult& r) {
    const auto rate = r.provenance.about.rate;
    const auto& f = r.figures;
    auto text = fmt::format("\nGaps: {}, {} frames missing\n", f.gaps.size(), f.frames_missing());
    text += listed(f.gaps, [rate](const GapFigure& gap) {
        return fmt::format("{}: {} frames ({:.1f} ms), {}", at_text(gap.at, rate), gap.frames,
                           1000.0 * static_cast<double>(gap.frames) / rate.value, name_of(gap.cause));
    });
    text += fmt::format("\nStates: {}, gates: {}\n", f.states.size(), f.gates.size());
    text += listed(f.states, [rate](const StateFigure& state) {
        return fmt::format("{}: {} to {} ({}), {}", at_text(state.at, rate), name_of(state.before),
                           name_of(state.after), name_of(state.cause), utc_text(state.time_ns)) +
               (state.by.source == ChangeSource::unknown ? "" : ", by " + told(state.by));
    });
    text += listed(f.gates, [rate](const GateFigure& gate) {
        return fmt::format("{}: gate {} {}", at_text(gate.at, rate), gate.name, gate.open ? "open" : "closed") +
               (gate.by.source == ChangeSource::unknown ? "" : ", by " + told(gate.by));
    });
    if (!f.sites.empty()) {
        text += fmt::format("\nSites left out of the evidence, and back: {}\n", f.sites.size());
        text += listed(f.sites, [&](const SiteFigure& site) {
            return fmt::format("{}: {} {}", at_text(site.at, rate), site_text(site.channel, r), name_of(site.state));
        });
    }
    text += fmt::format("\nNotes: {}\n", f.notes.size());
    text += listed(f.notes,
                   [rate](const Note& note) { return fmt::format("{}: {}", at_text(note.sample, rate), note.text); });
    return text;
}

std::string epoch_score_text(const char* reading, const Score& s) {
    return fmt::format("    {}: {:.2f} eligible minutes, hits {}, misses {}, false {} ({} per minute), hit rate {}\n",
                       reading, s.eligible_minutes, s.hits, s.misses, s.false_detections, figure(s.false_per_minute),
                       share(s.hit_rate));
}

std::string epochs_text(const AuditResult& r) {
    if (r.figures.epochs.empty()) {
        return {};
    }
    const auto rate = r.provenance.about.rate;
    std::string text = "\nEpochs\n";
    for (std::size_t i = 0; i < r.figures.epochs.size(); ++i) {
        const auto& epoch = r.figures.epochs[i];
        text += fmt::format("  {}: from {}, {:.2f} minutes, pulses {}, begun by {}\n", epoch.name,
                            at_text(epoch.from, rate), seconds_at(SampleIndex{epoch.to - epoch.from}, rate) / 60.0,
                            epoch.pulses_allowed ? "allowed" : "not allowed", told(epoch.by));
        text += fmt::format("    {} detections, {} triggers{}\n", epoch.detections, epoch.triggers,
                            r.blinded ? std::string{} : fmt::format(", {} pulses", epoch.pulses));
        if (r.score) {
            text += epoch_score_text("detector", r.score->epochs.at(i).detector);
            text += epoch_score_text("session", r.score->epochs.at(i).session);
        }
    }
    return text;
}

std::string speed_text(const AuditResult& r) {
    const auto& speed = r.figures.speed;
    return speed.events == 0
               ? std::string{}
               : fmt::format("\nSpeed\n  {} values received; of {} kept: least {:.3g}, median {:.3g}, most {:.3g}\n",
                             speed.values, speed.events, speed.least, speed.median, speed.most);
}

std::string floor_text(const AuditResult& r) {
    std::string text = "\nFloor, uV\n";
    for (const auto& floor : r.figures.floors) {
        text += fmt::format("  {}: mean {:.2f} (least {:.2f}, most {:.2f}), last {:.2f}, deviation {:.2f}, threshold "
                            "{:.2f}; {}\n",
                            site_text(floor.site, r), floor.mean_median, floor.mean_least, floor.mean_most,
                            floor.mean_last, floor.deviation_last, floor.threshold_last,
                            floor.settled ? "settled at " + at_text(floor.settled_at, r.provenance.about.rate)
                                          : std::string("never settled"));
    }
    return r.figures.floors.empty() ? text + "  none journaled\n" : text;
}

std::string verdict_text(const AuditResult& r) {
    const auto objections = r.objections();
    auto text = fmt::format("\nDropped by the journal: {} events, {} frames, {} packet timings\n", r.figures.dropped[0],
                            r.figures.dropped[1], r.figures.dropped[2]);
    text += "\nVerdict\n";
    for (const auto& objection : objections) {
        text += "  NOT GOOD: " + objection + "\n";
    }
    if (objections.empty()) {
        text += r.rerun.done ? "  every decision reproduced, all records intact\n"
                             : "  all records intact; decisions were NOT run again: " + r.rerun.why_not + "\n";
    }
    return text + (r.cut ? "  the session was cut\n" : "");
}

} // namespace

std::string audit_text(const AuditResult& r) {
    return head(r) + stated_text(r) + rerun_text(r) + decisions_text(r) + conditions_text(r) +
           (r.blinded ? std::string{} : control_text(r.controls)) + score_text(r) + epochs_text(r) + latency_text(r) +
           (r.blinded ? std::string{} : outputs_text(r)) + stream_text(r) + speed_text(r) + floor_text(r) +
           verdict_text(r);
}

} // namespace millpond
