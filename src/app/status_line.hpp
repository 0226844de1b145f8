// One line that says how a running session is. Thread: control.
#pragma once

#include "base/units.hpp"
#include "journal/live_figures.hpp"

#include <string>

namespace millpond {

/// State, closed gates, epoch and time left in it, rate, packets lost, floor, threshold, detections, pulses (`blinded`:
/// triggers), loop latency p50/p99; the newest speed and trouble where there are any.
[[nodiscard]] std::string status_line(const LiveFigures& figures, Hertz rate, bool blinded = false);

} // namespace millpond
