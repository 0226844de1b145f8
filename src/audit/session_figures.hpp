// What a session's events add up to. Thread: cold.
#pragma once

#include "audit/output_figures.hpp"
#include "base/event.hpp"
#include "journal/session_reader.hpp"

#include <array>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace millpond {

struct GapFigure {
    SampleIndex at;
    GapCause cause{};
    std::uint64_t frames = 0;
};

struct StateFigure {
    SampleIndex at;
    std::int64_t time_ns = 0;
    ArmState before{}, after{};
    StateCause cause{};
    ChangedBy by;
};

struct GateFigure {
    SampleIndex at;
    std::string name;
    bool open = false;
    ChangedBy by;
};

/// An epoch of the plan, and what fell into it by its sample.
struct EpochFigure {
    SampleIndex from, to; ///< `to`: the next one's start; of the last one UINT64_MAX
    std::uint16_t index = 0;
    std::string name;
    std::uint64_t planned_frames = 0; ///< 0: until told
    bool pulses_allowed = false;
    ChangedBy by; ///< what began it
    std::uint64_t detections = 0, triggers = 0, pulses = 0;
    std::array<std::uint64_t, rule_count> withheld{}; ///< by Rule
};

/// What the speed events say. In the unit of the settings.
struct SpeedFigure {
    std::uint64_t values = 0; ///< received
    std::uint64_t events = 0;
    double least = 0.0, median = 0.0, most = 0.0; ///< of the values that events kept
};

/// One site's floor over the session, from its events once a second. uV.
struct FloorFigure {
    std::uint16_t site = 0; ///< 65535: mean over sites
    std::uint64_t events = 0;
    bool settled = false;
    SampleIndex settled_at; ///< first event that says settled
    /// From the first settled one on; of all where none was.
    double mean_least = 0.0, mean_median = 0.0, mean_most = 0.0;
    double mean_last = 0.0;
    double deviation_last = 0.0, threshold_last = 0.0;
};

struct SiteFigure {
    SampleIndex at;
    std::uint16_t channel = 0;
    SiteState state{};
};

struct SessionFigures {
    std::uint64_t detections = 0, triggers = 0, catch_trials = 0, pulses = 0;
    std::uint64_t pulse_ends = 0;                            ///< of the first output that follows pulses
    std::array<std::uint64_t, 3> slots{}, orders{};          ///< by PulseOrigin; slots have no triggers among them
    std::array<std::uint64_t, rule_count> withheld{};        ///< detections, by Rule
    std::array<std::uint64_t, rule_count> omitted{};         ///< slots, by Rule
    std::array<std::uint64_t, packet_cause_count> packets{}; ///< by PacketCause
    std::array<std::uint64_t, 3> dropped{};                  ///< by Dropped
    std::vector<GapFigure> gaps;
    std::vector<StateFigure> states;
    std::vector<GateFigure> gates;
    std::vector<EpochFigure> epochs; ///< none: no plan
    SpeedFigure speed;
    std::vector<SiteFigure> sites; ///< left out of the evidence, and back
    std::vector<OutputFigure> outputs;
    std::vector<Note> notes;
    std::vector<FloorFigure> floors;

    [[nodiscard]] std::uint64_t frames_missing() const noexcept;
};

[[nodiscard]] SessionFigures session_figures(std::span<const Event> events);

} // namespace millpond
