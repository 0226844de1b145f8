// What a user may say about the gate that follows the animal's speed. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>

namespace millpond {

enum class SpeedUnit : std::uint8_t {
    cm_per_s,
    mm_per_s,
    m_per_s,
    pixels_per_s
};
inline constexpr Choice<SpeedUnit> speed_units[] = {{SpeedUnit::cm_per_s, "cm/s"},
                                                    {SpeedUnit::mm_per_s, "mm/s"},
                                                    {SpeedUnit::m_per_s, "m/s"},
                                                    {SpeedUnit::pixels_per_s, "pixels/s"}};

/// Name under which the gate is journaled. Commands cannot move it.
inline constexpr const char* speed_gate_name = "speed";

struct SpeedGateSettings {
    bool on = false;
    SpeedUnit unit = SpeedUnit::cm_per_s;
    double closes_above = 5.0; // immobility is published as below 5 cm/s (Liu et al. 2022, Nat Commun 13:6000)
    double opens_below = 4.0;
    double hold_ms = 500.0;
    double stale_after_ms = 500.0;
    double delay_ms = 0.0;

    bool operator==(const SpeedGateSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, SpeedGateSettings& gate) {
    visit.flag("on", gate.on, "close the gate `speed` while the animal runs, by the numbers of the command /speed");
    visit.choice("unit", gate.unit, speed_units, "unit of those numbers and of the two below");
    visit.number("closes_above", gate.closes_above, {0.0, 1e9}, "speed above which the gate closes, at once");
    visit.number("opens_below", gate.opens_below, {1e-6, 1e9},
                 "speed below which it opens again; at most closes_above");
    visit.number("hold_ms", gate.hold_ms, {0.0, 600000.0}, "how long the speed must have been below for that");
    visit.number("stale_after_ms", gate.stale_after_ms, {1.0, 600000.0},
                 "a speed older than this closes the gate; so does one that never came");
    visit.number("delay_ms", gate.delay_ms, {0.0, 10000.0},
                 "how late the numbers are (camera, tracking), as you know it: reported, never corrected for");
}

} // namespace millpond
