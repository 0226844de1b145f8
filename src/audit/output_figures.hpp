// What each output of a session did. Thread: cold.
#pragma once

#include "audit/latency_figures.hpp"
#include "base/event.hpp"

#include <optional>
#include <span>
#include <string>
#include <vector>

namespace millpond {

/// One output over the session. Times are of orders, by this computer's clock.
struct OutputFigure {
    std::uint16_t output = 0;                  ///< its place in settings, from 0
    std::string name;                          ///< empty where the session does not say
    bool marker = false;                       ///< follows triggers, not pulses
    std::uint64_t lost = 0;                    ///< how often its device was lost
    std::uint64_t ends = 0;                    ///< pulses that came to their end
    std::optional<LatencySummary> width, late; ///< order to rise to order to fall; planned fall to order to fall
};

/// In the order of settings.
[[nodiscard]] std::vector<OutputFigure> output_figures(std::span<const Event> events);

} // namespace millpond
