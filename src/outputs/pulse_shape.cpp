#include "outputs/pulse_shape.hpp"

#include "base/refusal.hpp"

#include <string>

namespace millpond {
namespace {

Nanos nanos(double ms) {
    return Nanos{static_cast<std::int64_t>(ms * 1e6)};
}

} // namespace

PulseShape pulse_shape(const OutputSettings& settings) {
    if (settings.train_pulses > 1 && settings.train_period_ms <= settings.width_ms) {
        throw Refusal(settings.where("train_period_ms"), std::to_string(settings.train_period_ms),
                      "more than width_ms, " + std::to_string(settings.width_ms));
    }
    return {nanos(settings.width_ms), settings.train_pulses, nanos(settings.train_period_ms)};
}

Nanos longest_high(const OutputSettings& settings) {
    if (settings.longest_high() <= settings.width_ms) {
        throw Refusal(settings.where("longest_high_ms"), std::to_string(settings.longest_high_ms),
                      "more than width_ms, " + std::to_string(settings.width_ms));
    }
    return nanos(settings.longest_high());
}

} // namespace millpond
