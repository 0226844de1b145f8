#include "base/event.hpp"

namespace millpond {
namespace {

template <std::size_t N>
std::string_view pick(const std::array<std::string_view, N>& names, std::uint8_t value) noexcept {
    return value < N ? names[value] : std::string_view{"unknown"};
}

} // namespace

std::string_view name_of(EventKind kind) noexcept {
    static constexpr std::array<std::string_view, 24> names{
        "unknown", "session start", "session end",  "detection", "trigger", "withheld", "pulse",        "pulse end",
        "gap",     "floor",         "latency bins", "note",      "state",   "gate",     "packet count", "dropped",
        "site",    "epoch",         "trial",        "order",     "speed",   "device",   "slot",         "omitted"};
    return pick(names, static_cast<std::uint8_t>(kind));
}

std::string_view name_of(Rule rule) noexcept {
    static constexpr std::array<std::string_view, rule_count> names{
        "none", "gap",      "unsettled",    "veto",          "faulted",      "not armed",   "gate",
        "held", "lock-out", "second limit", "session limit", "minute limit", "epoch limit", "interval"};
    return pick(names, static_cast<std::uint8_t>(rule));
}

std::string_view name_of(PulseOrigin origin) noexcept {
    static constexpr std::array<std::string_view, 3> names{"trigger", "schedule", "delay"};
    return pick(names, static_cast<std::uint8_t>(origin));
}

std::string_view name_of(GapCause cause) noexcept {
    static constexpr std::array<std::string_view, 4> names{"unknown", "packet loss", "non-finite", "source restart"};
    return pick(names, static_cast<std::uint8_t>(cause));
}

std::string_view name_of(ArmState state) noexcept {
    static constexpr std::array<std::string_view, 3> names{"not armed", "armed", "faulted"};
    return pick(names, static_cast<std::uint8_t>(state));
}

std::string_view name_of(SiteState state) noexcept {
    static constexpr std::array<std::string_view, 3> names{"alive", "flat", "huge"};
    return pick(names, static_cast<std::uint8_t>(state));
}

std::string_view name_of(StateCause cause) noexcept {
    static constexpr std::array<std::string_view, 12> names{
        "start",          "command", "stale stream",  "output failed",      "journal failed", "session end",
        "emergency stop", "runaway", "too many gaps", "floor out of range", "line held",      "watchdog lost"};
    return pick(names, static_cast<std::uint8_t>(cause));
}

std::string_view name_of(ChangeSource source) noexcept {
    static constexpr std::array<std::string_view, 8> names{"unknown",   "settings", "command", "signal",
                                                           "LFP state", "speed",    "plan",    "program"};
    return pick(names, static_cast<std::uint8_t>(source));
}

std::string_view name_of(DeviceState state) noexcept {
    static constexpr std::array<std::string_view, 3> names{"ready", "lost", "back"};
    return pick(names, static_cast<std::uint8_t>(state));
}

std::string_view name_of(LatencyPart part) noexcept {
    static constexpr std::array<std::string_view, latency_part_count> names{
        "packing", "transport", "wake", "compute", "output", "loop", "pulse end"};
    return pick(names, static_cast<std::uint8_t>(part));
}

std::string_view name_of(PacketCause cause) noexcept {
    static constexpr std::array<std::string_view, packet_cause_count> names{
        "accepted",  "truncated", "wrong version", "wrong payload type", "wrong source", "wrong length",
        "oversized", "repeated",  "late",          "reordered",          "lost",         "restarted"};
    return pick(names, static_cast<std::uint8_t>(cause));
}

} // namespace millpond
