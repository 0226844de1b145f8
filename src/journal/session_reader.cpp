#include "journal/session_reader.hpp"

#include "base/refusal.hpp"
#include "journal/session_folder.hpp"

#include <algorithm>
#include <map>

namespace millpond {
namespace {

const std::filesystem::path& checked(const std::filesystem::path& folder) {
    constexpr auto allowed = "a session folder, with records.mpj in it";
    if (!std::filesystem::is_directory(folder)) {
        throw Refusal(folder.string(), "no folder", allowed);
    }
    if (!std::filesystem::exists(folder / records_name)) {
        const bool dry_run = std::filesystem::exists(folder / "score.json");
        throw Refusal(folder.string(), dry_run ? "the output of a dry run" : "a folder without records", allowed);
    }
    return folder;
}

// Other kinds carry the place up to which samples had come, which the engine's own words may not have reached.
bool said_by_the_engine(EventKind kind) {
    return kind == EventKind::detection || kind == EventKind::trigger || kind == EventKind::withheld ||
           kind == EventKind::gap || kind == EventKind::floor || kind == EventKind::state || kind == EventKind::gate ||
           kind == EventKind::site || kind == EventKind::note || kind == EventKind::epoch;
}

SampleIndex end_of(const ReadRecords& records) {
    SampleIndex end{};
    for (const auto& event : records.events) {
        end = said_by_the_engine(event.kind) ? std::max(end, event.sample) : end;
    }
    return records.closed ? records.events.back().sample : end;
}

} // namespace

SessionReader::SessionReader(const std::filesystem::path& folder)
    : folder_(checked(folder)), provenance_(read_provenance(folder / provenance_name)),
      records_(read_records(folder / records_name)), end_(end_of(records_)) {}

std::filesystem::path SessionReader::settings_file() const {
    return folder_ / settings_name;
}

std::optional<SampleFileReader> SessionReader::open_samples() const {
    for (const auto format : {StoreSamples::rf64, StoreSamples::w64}) {
        const auto file = folder_ / sample_file_name(format);
        if (std::filesystem::exists(file)) {
            return SampleFileReader(file);
        }
    }
    return std::nullopt;
}

std::vector<FloorDetail> last_floors(std::span<const Event> events) {
    std::map<std::uint16_t, FloorDetail> newest;
    for (const auto& event : events) {
        if (event.kind == EventKind::floor) {
            const auto floor = event.as<FloorDetail>();
            const auto known = newest.find(floor.site);
            if (known == newest.end() || floor.gates_closed <= known->second.gates_closed) {
                newest[floor.site] = floor;
            }
        }
    }
    std::vector<FloorDetail> floors;
    floors.reserve(newest.size());
    for (const auto& [site, floor] : newest) {
        floors.push_back(floor);
    }
    return floors;
}

std::string gate_name(const GateDetail& gate) {
    return {gate.name.begin(), std::find(gate.name.begin(), gate.name.end(), '\0')};
}

std::string epoch_name(const EpochDetail& epoch) {
    return {epoch.name.begin(), std::find(epoch.name.begin(), epoch.name.end(), '\0')};
}

std::string told(const ChangedBy& by) {
    std::string text(name_of(by.source));
    if (by.source == ChangeSource::command && by.port != 0) {
        const auto part = [&by](int shift) { return std::to_string(by.address >> shift & 255U); };
        text += " from " + part(24) + "." + part(16) + "." + part(8) + "." + part(0) + ":" + std::to_string(by.port);
    }
    return text;
}

std::vector<Note> notes_in(std::span<const Event> events) {
    std::vector<Note> notes;
    bool continued = false;
    for (const auto& event : events) {
        if (event.kind != EventKind::note) {
            continue;
        }
        const auto detail = event.as<NoteDetail>();
        if (!continued) {
            notes.push_back({event.sample, event.time_ns, {}});
        }
        notes.back().text.append(detail.text.data(), std::min<std::size_t>(detail.length, detail.text.size()));
        continued = detail.continues != 0;
    }
    return notes;
}

} // namespace millpond
