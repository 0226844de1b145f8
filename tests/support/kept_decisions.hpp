// What an engine decided, kept for a test to look at; and settings with which it settles soon. Thread: test.
#pragma once

#include "engine/engine.hpp"

#include <algorithm>
#include <cstdint>
#include <iterator>
#include <vector>

namespace millpond::test {

struct KeptDecisions : EventSink, PulsePort {
    std::vector<Event> events, orders, marks;
    std::vector<std::uint64_t> pulses; ///< places of the orders
    void take(const Event& event) noexcept override { events.push_back(event); }
    void fire(const Event& order) noexcept override {
        orders.push_back(order);
        pulses.push_back(order.sample.value);
    }
    void mark(const Event& trigger) noexcept override { marks.push_back(trigger); }
    [[nodiscard]] std::vector<Event> of(EventKind kind) const {
        std::vector<Event> found;
        std::copy_if(events.begin(), events.end(), std::back_inserter(found),
                     [kind](const auto& event) { return event.kind == kind; });
        return found;
    }
};

/// The textbook chain, settled after two seconds.
inline EngineSettings quick_settings() {
    EngineSettings settings;
    settings.detector.method = DetectionMethod::envelope;
    settings.detector.floor.settle_s = 2.0;
    settings.detector.floor.time_constant_s = 5.0;
    settings.detector.threshold.deviations = 6.0;
    return settings;
}

} // namespace millpond::test
