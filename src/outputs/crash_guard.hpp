// Orders the lines low when this program crashes, before it dies: sooner than the watchdog, which hears of a crash only
// once the kernel has written the core file.
#pragma once

#include "outputs/output.hpp"

#include <span>

namespace millpond {

/// Makes abort, segmentation fault and their like order these lines low, at most most_outputs. Empty takes the guard
/// away. Thread: control.
void guard_lines_against_crashes(std::span<Output* const> outputs);

} // namespace millpond
