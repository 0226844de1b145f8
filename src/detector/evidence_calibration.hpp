// From the false detections that are asked for to the threshold, by the measured background. Thread: control.
#pragma once

#include "detector/evidence_settings.hpp"

#include <string>

namespace millpond {

/// Threshold in deviations above the floor at which the background crosses `false_per_minute` times a minute: between
/// two measured points, and beyond the last ones, the logarithm of the rate goes straight, as the tail of a running
/// maximum does far out (common practice). Refuses fewer than two points and points whose rate does not fall.
[[nodiscard]] double threshold_for(const EvidenceSettings& evidence, const std::string& where);

} // namespace millpond
