#include "app/from_settings.hpp"

#include "base/refusal.hpp"
#include "journal/session_reader.hpp"
#include "settings/yaml_writer.hpp"

#include <fmt/format.h>

#include <algorithm>

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

void check_floor_channels(const FloorLimitSettings& limits, const Detector& detector) {
    for (std::size_t i = 0; i < limits.channels.size(); ++i) {
        std::string there;
        bool known = false;
        for (std::size_t floor = 0; floor < detector.floor_count(); ++floor) {
            const auto site = detector.floor(floor).site;
            const std::uint32_t channel = site == 65535 ? 0U : site + 1U;
            there += (there.empty() ? "" : ", ") + std::to_string(channel);
            known = known || channel == limits.channels[i].channel;
        }
        if (!known) {
            throw Refusal(fmt::format("limits.floor.channels[{}].channel", i),
                          fmt::format("{}, which has no floor", limits.channels[i].channel), "one of " + there);
        }
    }
}

ScheduleLimits limits_of(const ArbiterSettings& arbiter) {
    ScheduleLimits limits;
    limits.lockout_ms = std::max(arbiter.lockout_ms, arbiter.limits.min_interval_ms);
    limits.max_pulses_per_second = arbiter.limits.max_pulses_per_second;
    limits.max_pulses_per_minute = arbiter.limits.max_pulses_per_minute;
    limits.max_pulses_per_epoch = arbiter.limits.max_pulses_per_epoch;
    limits.max_pulses_per_session = arbiter.limits.max_pulses_per_session;
    double start_s = 0.0;
    for (const auto& epoch : arbiter.plan.epochs) {
        limits.epoch_starts_s.push_back(start_s);
        if (epoch.minutes == 0.0) {
            break; // the operator ends it: nobody knows beforehand when the next one begins
        }
        start_s += epoch.minutes * 60.0;
    }
    return limits;
}

Schedule schedule_for(const ArbiterSettings& arbiter, Hertz rate) {
    Schedule schedule;
    if (!arbiter.schedule_file.empty()) {
        schedule = read_schedule(arbiter.schedule_file, rate);
        check_schedule(schedule, limits_of(arbiter), rate, arbiter.schedule_file);
    }
    return schedule;
}

std::optional<Assigned> assigned_for(Settings& settings, Hertz rate, const std::string& where) {
    if (settings.assignment.file.empty()) {
        return std::nullopt;
    }
    const auto list = read_assignment(settings.assignment.file);
    const auto& session = session_of(list, settings.assignment.code, where + ": assignment.code");
    if ((list.has(Condition::yoked) || list.has(Condition::rate_matched)) && settings.arbiter.schedule_file.empty()) {
        throw Refusal(where + ": arbiter.schedule_file", "none",
                      "a control schedule: some sessions of " + settings.assignment.file + " play one");
    }
    for (const auto& output : settings.outputs) {
        if (list.sealed && !output.condition.empty()) {
            throw Refusal(where + ": " + output.where("condition"), output.condition,
                          "nothing: " + settings.assignment.file + " is sealed, and the line would tell");
        }
    }
    settings.arbiter.delay.in_every_condition =
        settings.arbiter.delay.in_every_condition || list.has(Condition::delayed);
    Assigned assigned{session_assignment(list, session), session.conditions, 0};
    if (list.unit == AssignmentUnit::block) {
        assigned.block_frames = frames_in_ms(list.block_minutes * 60000.0, rate);
    }
    return assigned;
}

std::string settings_hash(const Settings& settings, const Channels& channels) {
    auto text = to_yaml(settings.detector) + to_yaml(settings.arbiter) + to_yaml(settings.arbiter.limits) +
                to_yaml(settings.arbiter.plan) + to_yaml(settings.arbiter.speed_gate);
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
