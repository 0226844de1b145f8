// What preflight says of limits against each other, of plan, speed gate and stimulus. Thread: cold.
#pragma once

#include "realtime/fitness.hpp"
#include "settings/settings.hpp"

#include <string>
#include <vector>

namespace millpond {

/// Limits that can never be reached, or are reached sooner than the plan lasts, and what the guards look for.
[[nodiscard]] std::vector<Finding> check_limits(const Settings& settings);
/// Charge and its warnings; none where nothing is described.
[[nodiscard]] std::vector<Finding> check_stimulus(const StimulusSettings& stimulus);

/// "closes above 5 cm/s, opens below 4 cm/s for 500 ms; ...".
[[nodiscard]] std::string told(const SpeedGateSettings& gate);

} // namespace millpond
