// The session's plan: epochs in a row, by the clock of samples. Thread: loop for everything but make.
// Allocates after make: never.
#pragma once

#include "arbiter/plan_settings.hpp"
#include "base/event.hpp"
#include "base/units.hpp"

#include <vector>

namespace millpond {

/// Name of what follows the last epoch: no pulses, until the session ends.
inline constexpr const char* after_plan_name = "after the plan";

class SessionPlan {
  public:
    static SessionPlan make(const PlanSettings& settings, Hertz rate);

    /// There is a plan; without one all below says: one endless epoch with pulses.
    [[nodiscard]] bool present() const noexcept { return !epochs_.empty(); }

    /// The session's first sample.
    void start(SampleIndex at) noexcept;
    /// The next epoch begins. Nothing happens after the last one.
    void next(SampleIndex at) noexcept;
    /// Where the next epoch begins by itself; UINT64_MAX where it does not.
    [[nodiscard]] SampleIndex next_start() const noexcept { return next_start_; }

    [[nodiscard]] bool pulses() const noexcept { return !present() || (!over() && epochs_[now_].pulses); }
    /// The last epoch has ended.
    [[nodiscard]] bool over() const noexcept { return present() && now_ >= epochs_.size(); }
    /// And the session is to end with it.
    [[nodiscard]] bool ends_session() const noexcept { return over() && ends_session_; }

    /// The epoch as its event says it.
    [[nodiscard]] EpochDetail detail(const ChangedBy& by) const noexcept;

  private:
    struct Epoch {
        std::string name;
        std::uint64_t frames;
        bool pulses;
    };
    void begin(SampleIndex at) noexcept;

    std::vector<Epoch> epochs_;
    bool ends_session_ = false;
    std::size_t now_ = 0;
    SampleIndex next_start_{UINT64_MAX};
};

} // namespace millpond
