// Takes places in order of their wishes and moves each one later until it is far enough from those before it: put off,
// never dropped, so that the number of pulses stays matched. Thread: cold.
#pragma once

#include "sham/schedule.hpp"

#include <algorithm>

namespace millpond {

class Placer {
  public:
    Placer(double min_interval_ms, std::uint32_t per_second, std::uint32_t per_minute, Hertz rate)
        : rate_(rate), min_interval_(frames_in_ms(min_interval_ms, rate)), second_(frames_in_ms(1000.0, rate)),
          minute_(frames_in_ms(60000.0, rate)), per_second_(per_second), per_minute_(per_minute) {}

    /// The first place from `wish` on that is far enough from those taken.
    [[nodiscard]] SampleIndex first_free(SampleIndex wish) const {
        SampleIndex at = wish;
        const auto& taken = made_.places;
        if (!taken.empty()) {
            at = std::max(at, taken.back() + std::max<std::uint64_t>(1, min_interval_));
        }
        if (taken.size() >= per_second_) {
            at = std::max(at, taken[taken.size() - per_second_] + second_);
        }
        if (taken.size() >= per_minute_) {
            at = std::max(at, taken[taken.size() - per_minute_] + minute_);
        }
        return at;
    }

    void take(SampleIndex at, SampleIndex wish) {
        if (at > wish) {
            ++made_.put_off;
            made_.longest_put_off_ms =
                std::max(made_.longest_put_off_ms, 1000.0 * static_cast<double>(at - wish) / rate_.value);
        }
        made_.places.push_back(at);
    }

    [[nodiscard]] MadeSchedule made() { return std::move(made_); }

  private:
    Hertz rate_;
    std::uint64_t min_interval_, second_, minute_;
    std::uint32_t per_second_, per_minute_;
    MadeSchedule made_;
};

} // namespace millpond
