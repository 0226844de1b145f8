// Lock-out and limits: how soon and how many. What is counted is triggers, alike in every condition, so that conditions
// stay matched whatever becomes of a trigger.
// Thread: loop for everything but make. Allocates after make: never.
#pragma once

#include "arbiter/limits_settings.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <vector>

namespace millpond {

class PulseLimits {
  public:
    static PulseLimits make(const LimitsSettings& settings, double lockout_ms, Hertz rate);

    /// The first rule that a trigger at `at` would break; Rule::none where it may be.
    [[nodiscard]] Rule refusal(SampleIndex at) const noexcept;
    void count(SampleIndex at) noexcept;
    /// The epoch's count begins anew.
    void begin_epoch() noexcept { in_epoch_ = 0; }

    [[nodiscard]] std::uint32_t triggers() const noexcept { return count_; }

  private:
    [[nodiscard]] bool within(SampleIndex at, std::uint32_t most, std::uint64_t frames) const noexcept;

    std::uint64_t lockout_frames_ = 0, interval_frames_ = 0, second_frames_ = 0, minute_frames_ = 0;
    std::uint32_t per_second_ = 1, per_minute_ = 1, per_epoch_ = 1, per_session_ = 1;
    std::uint32_t count_ = 0, in_epoch_ = 0;
    std::vector<SampleIndex> recent_; // ring of the newest triggers, as many as the larger of the two rates allows
};

} // namespace millpond
