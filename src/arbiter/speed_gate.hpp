// The gate that follows the animal's speed, by numbers that come now and then from outside.
//
// A speed above `closes_above` closes it at once. It opens once every speed for `hold_ms` was below `opens_below`. A
// speed older than `stale_after_ms` closes it, and the hold begins anew. Nothing is smoothed. Times are those of
// arrival, by the monotonic clock; that the numbers are late already, by `delay_ms`, is reported and not corrected for.
// Thread: loop. Allocates: never.
#pragma once

#include "arbiter/speed_gate_settings.hpp"
#include "base/units.hpp"

namespace millpond {

class SpeedGate {
  public:
    explicit SpeedGate(const SpeedGateSettings& settings) noexcept;

    /// A finite speed of 0 or more. In order of arrival.
    void take(double speed, Nanos came) noexcept;
    /// As it is at `now`. Closed before the first speed.
    [[nodiscard]] bool open_at(Nanos now) noexcept;

    [[nodiscard]] bool any() const noexcept { return any_; }
    [[nodiscard]] double newest() const noexcept { return newest_; }
    [[nodiscard]] Nanos came() const noexcept { return came_; }

  private:
    double closes_above_, opens_below_;
    Nanos hold_, stale_after_;
    double newest_ = 0.0;
    Nanos came_{}, below_since_{};
    bool any_ = false, below_ = false, open_ = false;
};

} // namespace millpond
