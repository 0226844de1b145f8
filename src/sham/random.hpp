// The random numbers of control schedules: SplitMix64 (Steele, Lea & Flood 2014, OOPSLA, "Fast splittable pseudorandom
// number generators"), so that a seed gives the same schedule on every computer. Thread: one owner.
#pragma once

#include <cmath>
#include <cstdint>

namespace millpond {

class SplitMix64 {
  public:
    explicit SplitMix64(std::uint64_t seed) noexcept : state_(seed) {}

    std::uint64_t next() noexcept {
        state_ += 0x9E3779B97F4A7C15U;
        std::uint64_t z = state_;
        z = (z ^ (z >> 30U)) * 0xBF58476D1CE4E5B9U;
        z = (z ^ (z >> 27U)) * 0x94D049BB133111EBU;
        return z ^ (z >> 31U);
    }

    /// Uniform from 0 up to, not including, 1: the upper 53 bits.
    double uniform() noexcept { return static_cast<double>(next() >> 11U) * 0x1.0p-53; }

    /// Exponential law with this mean.
    double exponential(double mean) noexcept { return -mean * std::log1p(-uniform()); }

  private:
    std::uint64_t state_;
};

} // namespace millpond
