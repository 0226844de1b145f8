#include "arbiter/speed_gate.hpp"

namespace millpond {
namespace {

Nanos nanos(double ms) noexcept {
    return Nanos{static_cast<std::int64_t>(ms * 1e6)};
}

} // namespace

SpeedGate::SpeedGate(const SpeedGateSettings& settings) noexcept
    : closes_above_(settings.closes_above), opens_below_(settings.opens_below), hold_(nanos(settings.hold_ms)),
      stale_after_(nanos(settings.stale_after_ms)) {}

void SpeedGate::take(double speed, Nanos came) noexcept {
    (void)open_at(came); // had the one before grown stale by then?
    if (speed < opens_below_ && !below_) {
        below_since_ = came;
    }
    below_ = speed < opens_below_;
    open_ = open_ && speed <= closes_above_;
    newest_ = speed;
    came_ = came;
    any_ = true;
}

bool SpeedGate::open_at(Nanos now) noexcept {
    if (!any_ || now - came_ >= stale_after_) {
        open_ = false;
        below_ = false;
    } else if (below_ && now - below_since_ >= hold_) {
        open_ = true;
    }
    return open_;
}

} // namespace millpond
