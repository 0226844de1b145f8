#include "app/from_settings.hpp"

#include "base/refusal.hpp"
#include "journal/session_reader.hpp"
#include "settings/yaml_writer.hpp"

#include <fmt/format.h>

namespace millpond {

Channels channels_for(const Settings& settings, const Channels& recorded, const std::string& where) {
    if (settings.channels.empty()) {
        return recorded;
    }
    if (settings.channels.size() != recorded.size()) {
        throw Refusal(where + ": channels", fmt::format("{} channels", settings.channels.size()),
                      fmt::format("as many as the recording has, {}, or none", recorded.size()));
    }
    return settings.channels;
}

std::vector<FloorState> warm_start_floors(const DetectorSettings& detector) {
    std::vector<FloorState> floors;
    if (!detector.floor.warm_start_session.empty()) {
        for (const auto& floor : last_floors(SessionReader(detector.floor.warm_start_session).events())) {
            floors.push_back({floor.mean, floor.deviation, floor.frames});
        }
    }
    return floors;
}

ScheduleLimits limits_of(const ArbiterSettings& arbiter) {
    return {arbiter.lockout_ms, arbiter.max_pulses_per_second, arbiter.max_pulses_per_session};
}

Schedule schedule_for(const ArbiterSettings& arbiter, Hertz rate) {
    Schedule schedule;
    if (!arbiter.schedule_file.empty()) {
        schedule = read_schedule(arbiter.schedule_file, rate);
        check_schedule(schedule, limits_of(arbiter), rate, arbiter.schedule_file);
    }
    return schedule;
}

std::string settings_hash(const Settings& settings, const Channels& channels) {
    auto text = to_yaml(settings.detector) + to_yaml(settings.arbiter);
    for (const auto& channel : channels) {
        text += to_yaml(channel);
    }
    std::uint64_t hash = 0xCBF29CE484222325U; // Fowler, Noll and Vo's offset basis and, below, prime
    for (const char c : text) {
        hash = (hash ^ static_cast<unsigned char>(c)) * 0x100000001B3U;
    }
    return fmt::format("{:016x}", hash);
}

} // namespace millpond
