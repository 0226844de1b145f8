// What a user may say about the gate that follows the animal's state. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <string>
#include <string_view>

namespace millpond {

/// What commands, journal and reports call the gate that the signal itself moves; with it on no other may have the
/// name.
inline constexpr std::string_view state_gate_name = "state";

struct StateGateSettings {
    bool on = false;
    std::string signal = "sites";
    double theta_low_hz = 5.0; // common practice: theta 5-10 Hz, delta 1-4 Hz
    double theta_high_hz = 10.0;
    double delta_low_hz = 1.0;
    double delta_high_hz = 4.0;
    // On the scene hard (three seeds of 10 min) these three agree with the animal in 93 % of the time and close within
    // 4.0 s of running; with 2 s of smoothing it is 90 % and 6.1 s.
    double smoothing_s = 1.0;
    double close_above = 1.0;
    double open_below = 0.5;

    bool operator==(const StateGateSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, StateGateSettings& gate) {
    visit.flag("on", gate.on, "close the gate `state` while the signal shows theta (running, REM sleep)");
    visit.text("signal", gate.signal,
               "what it looks at: sites (mean over ripple sites), reference (mean over them), or a channel's name");
    visit.number("theta_low_hz", gate.theta_low_hz, {1.0, 30.0}, "lower edge of theta (butterworth, -3 dB)");
    visit.number("theta_high_hz", gate.theta_high_hz, {1.0, 30.0}, "upper edge of theta");
    visit.number("delta_low_hz", gate.delta_low_hz, {0.2, 30.0}, "lower edge of delta");
    visit.number("delta_high_hz", gate.delta_high_hz, {0.2, 30.0}, "upper edge of delta");
    visit.number("smoothing_s", gate.smoothing_s, {0.1, 60.0}, "time constant of the power in both bands");
    visit.number("close_above", gate.close_above, {0.001, 1e6},
                 "the gate closes when theta's power is more than so many times delta's");
    visit.number("open_below", gate.open_below, {0.001, 1e6},
                 "and opens when it is less than so many times; less than close_above");
}

} // namespace millpond
