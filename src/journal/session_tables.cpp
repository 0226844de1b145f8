#include "journal/session_tables.hpp"

#include "recording/whole_file.hpp"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <cstring>

namespace millpond {
namespace {

std::string site_text(std::uint16_t site) {
    return site == 65535 ? "mean" : fmt::format("{}", site);
}

void add_nanos(TableEvent& row, const char* column, std::int64_t ns) {
    if (ns != PulseDetail::not_measured) {
        row.extra[column] = fmt::format("{:.3f}", static_cast<double>(ns) / 1000.0);
    }
}

void fill_detection(TableEvent& row, const DetectionDetail& detail) {
    row.extra["envelope_uv"] = fmt::format("{}", detail.envelope);
    row.extra["floor_uv"] = fmt::format("{}", detail.floor);
    row.extra["threshold_uv"] = fmt::format("{}", detail.threshold);
    row.extra["site"] = site_text(detail.site);
    row.extra["votes"] = fmt::format("{}", detail.votes);
}

void fill_pulse(TableEvent& row, const PulseDetail& detail) {
    add_nanos(row, "packing_us", detail.packing_ns);
    add_nanos(row, "transport_us", detail.transport_ns);
    add_nanos(row, "wake_us", detail.wake_ns);
    add_nanos(row, "compute_us", detail.compute_ns);
    add_nanos(row, "output_us", detail.output_ns);
}

void fill_moment(TableEvent& row, const TriggerDetail& detail) {
    row.extra["number"] = fmt::format("{}", detail.number);
    row.extra["origin"] = name_of(detail.origin);
    row.extra["from"] = fmt::format("{}", detail.from);
    row.extra["catch"] = fmt::format("{}", detail.caught);
}

// A tab would make a column.
std::string one_line(std::string text) {
    for (auto& c : text) {
        c = static_cast<unsigned char>(c) < 0x20 ? ' ' : c;
    }
    return text;
}

// Empty trial_type where the event has no row.
TableEvent row_of(const Event& event, Hertz rate) {
    TableEvent row;
    row.onset_s = seconds_at(event.sample, rate);
    row.sample = static_cast<std::int64_t>(event.sample.value);
    switch (event.kind) {
    case EventKind::detection:
        fill_detection(row, event.as<DetectionDetail>());
        break;
    case EventKind::trigger:
    case EventKind::slot:
    case EventKind::order:
        fill_moment(row, event.as<TriggerDetail>());
        break;
    case EventKind::omitted:
        fill_moment(row, event.as<TriggerDetail>());
        row.extra["rule"] = name_of(static_cast<Rule>(event.code));
        break;
    case EventKind::withheld:
        row.extra["rule"] = name_of(static_cast<Rule>(event.code));
        break;
    case EventKind::pulse:
        fill_pulse(row, event.as<PulseDetail>());
        break;
    case EventKind::trial:
        row.extra["number"] = fmt::format("{}", event.as<TrialDetail>().number);
        break;
    case EventKind::site:
        row.extra["site"] = site_text(event.as<SiteDetail>().channel);
        row.extra["cause"] = name_of(static_cast<SiteState>(event.code));
        break;
    case EventKind::epoch: {
        const auto epoch = event.as<EpochDetail>();
        row.extra["text"] = one_line(epoch_name(epoch));
        row.extra["cause"] = name_of(by_of(epoch).source);
        break;
    }
    case EventKind::device: {
        const auto device = event.as<DeviceDetail>();
        row.extra["cause"] = name_of(static_cast<DeviceState>(event.code));
        row.extra["text"] = std::string(device.name.data(), ::strnlen(device.name.data(), device.name.size()));
        break;
    }
    case EventKind::gap:
        row.duration_s = static_cast<double>(event.as<GapDetail>().frames) / rate.value;
        row.extra["cause"] = name_of(static_cast<GapCause>(event.code));
        break;
    default:
        return row;
    }
    row.trial_type = name_of(event.kind);
    return row;
}

TableEvent row_of(const Note& note, Hertz rate) {
    TableEvent row;
    row.onset_s = seconds_at(note.sample, rate);
    row.sample = static_cast<std::int64_t>(note.sample.value);
    row.trial_type = name_of(EventKind::note);
    row.extra["text"] = one_line(note.text);
    return row;
}

nlohmann::json dictionary() {
    const auto column = [](const char* what, const char* units = nullptr) {
        nlohmann::json entry{{"Description", what}};
        if (units != nullptr) {
            entry["Units"] = units;
        }
        return entry;
    };
    nlohmann::json json{
        {"onset", column("Place in the stream, from the session's first sample", "s")},
        {"duration", column("Pulse: order to rise until order to fall, by the first output that follows pulses; gap: "
                            "frames missing; else 0",
                            "s")},
        {"sample", column("Place in the stream, counted in frames from 0; missing frames are counted too")},
        {"rule", column("The one rule that refused a withheld detection or an omitted moment")},
        {"cause", column("Why frames are missing; site: flat or huge where it is left out, alive where it is back; "
                         "epoch: what began it; device: ready, lost or back")},
        {"number", column("Count of the session's triggers, from 1; of origin schedule: place in the schedule; trial: "
                          "of the assignment")},
        {"origin", column("Why there is a moment for a pulse: trigger (at once), delay (a while later), schedule")},
        {"from", column("Decision sample of the trigger; of origin schedule: the planned place")},
        {"catch", column("1 where the trigger is a catch trial, drawn alike in every condition: no pulse; else 0")},
        {"site", column("Channel in the stream that decided, or `mean` for the mean over sites and for evidence")},
        {"votes", column("Ripple sites above their thresholds")},
        {"envelope_uv", column("Envelope at the decision sample", "uV")},
        {"floor_uv", column("Running mean of the envelope", "uV")},
        {"threshold_uv", column("Threshold at the decision sample", "uV")},
        {"packing_us", column("Decision sample to the last sample of its packet; n/a: not measured", "us")},
        {"transport_us", column("Packet sent to packet arrived; n/a: not measured", "us")},
        {"wake_us", column("Packet arrived to loop begins on it; n/a: not measured", "us")},
        {"compute_us", column("Loop begins to decision made; n/a: not measured", "us")},
        {"output_us", column("Decision made to write returned; n/a: not measured", "us")},
        {"text", column("The operator's mark; an epoch's name; device: the output's name")}};
    json["trial_type"] = column("What happened");
    json["trial_type"]["Levels"] = {
        {"detection", "The detector crossed"},
        {"trigger", "A detection that was let through, in every condition"},
        {"slot", "A moment for a pulse that does not follow a trigger at once; blanked in every condition"},
        {"omitted", "Such a moment, at which no condition may give a pulse"},
        {"order", "A pulse was ordered"},
        {"trial", "A session, block or trial of the assignment begins"},
        {"withheld", "A detection that was refused"},
        {"pulse", "The order was written to the output"},
        {"gap", "Frames are missing from here"},
        {"site", "A channel is left out of the evidence from here, or is back"},
        {"epoch", "An epoch of the session's plan begins"},
        {"device", "An output stands ready, was lost or is back"},
        {"note", "The operator's mark"}};
    return json;
}

/// Several outputs may end a pulse, each in its own time: the first in settings stands for all.
std::uint16_t first_pulse_output(std::span<const Event> events) {
    std::uint16_t first = UINT16_MAX;
    for (const auto& event : events) {
        if (event.kind == EventKind::pulse_end && event.as<PulseEndDetail>().marker == 0) {
            first = std::min(first, event.as<PulseEndDetail>().output);
        }
    }
    return first;
}

} // namespace

const std::vector<std::string>& session_table_columns() {
    static const std::vector<std::string> columns{
        "rule",         "cause",   "number",      "origin",    "from",         "catch",
        "site",         "votes",   "envelope_uv", "floor_uv",  "threshold_uv", "packing_us",
        "transport_us", "wake_us", "compute_us",  "output_us", "text"};
    return columns;
}

std::vector<TableEvent> session_table(std::span<const Event> events, Hertz rate, bool blinded) {
    std::vector<TableEvent> rows;
    constexpr auto none = static_cast<std::size_t>(-1);
    auto pulse = none; // the row that waits for its end
    const auto first_output = first_pulse_output(events);
    for (const auto& event : events) {
        if (blinded && tells_of_condition(event.kind)) {
            continue;
        }
        if (event.kind == EventKind::pulse_end && pulse != none) {
            const auto end = event.as<PulseEndDetail>();
            if (end.marker == 0 && end.output == first_output) {
                rows[pulse].duration_s = static_cast<double>(end.width_ns) / 1e9;
                pulse = none;
            }
            continue;
        }
        auto row = row_of(event, rate);
        if (!row.trial_type.empty()) {
            if (event.kind == EventKind::pulse) {
                pulse = rows.size();
            }
            rows.push_back(std::move(row));
        }
    }
    for (const auto& note : notes_in(events)) {
        rows.push_back(row_of(note, rate));
    }
    return rows;
}

void write_session_tables(const SessionReader& session, const std::filesystem::path& folder, bool blinded) {
    write_events_table(folder / "events.tsv", session_table(session.events(), session.rate(), blinded),
                       session_table_columns());
    write_whole_file(folder / "events.json", dictionary().dump(2) + "\n");
}

} // namespace millpond
