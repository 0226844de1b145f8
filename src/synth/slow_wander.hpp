// A value that wanders slowly and smoothly about 0 with deviation 1: two sines of unrelated periods.
#pragma once

#include "base/random.hpp"

namespace millpond {

class SlowWander {
  public:
    /// Phases, and periods within a fifth of `period_s` and of 0.382 of it, are drawn from `random`.
    SlowWander(Random random, double period_s) noexcept {
        for (auto& sine : sines_) {
            sine.start_turns = random.uniform();
            sine.turns_per_s = 1.0 / (period_s * (0.8 + 0.4 * random.uniform()));
        }
        sines_[1].turns_per_s /= 0.382;
    }

    [[nodiscard]] double at(double t) const noexcept {
        double sum = 0.0;
        for (const auto& sine : sines_) {
            sum += portable_sin_turns(sine.start_turns + t * sine.turns_per_s);
        }
        return sum;
    }

  private:
    struct Sine {
        double start_turns, turns_per_s;
    };
    std::array<Sine, 2> sines_{};
};

} // namespace millpond
