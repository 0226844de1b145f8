// Random numbers that are the same on every machine. Thread: one owner each.
#pragma once

#include "base/portable_math.hpp"

#include <array>
#include <cstdint>

namespace millpond {

/// SplitMix64 (Steele, Lea & Flood 2014, OOPSLA): makes a state out of a seed.
class SplitMix64 {
  public:
    explicit SplitMix64(std::uint64_t seed) noexcept : state_(seed) {}

    std::uint64_t next() noexcept {
        state_ += 0x9E3779B97F4A7C15u;
        std::uint64_t mixed = state_;
        mixed = (mixed ^ (mixed >> 30)) * 0xBF58476D1CE4E5B9u;
        mixed = (mixed ^ (mixed >> 27)) * 0x94D049BB133111EBu;
        return mixed ^ (mixed >> 31);
    }

  private:
    std::uint64_t state_;
};

/// xoshiro256++ (Blackman & Vigna 2019), its state filled by SplitMix64 from a seed and the number of a stream:
/// whatever draws numbers has a stream of its own, so that something new changes nothing else.
class Random {
  public:
    Random(std::uint64_t seed, std::uint64_t stream) noexcept {
        SplitMix64 words(SplitMix64(seed).next() ^ stream);
        for (auto& word : state_) {
            word = words.next();
        }
    }

    std::uint64_t bits() noexcept {
        const std::uint64_t result = rotated(state_[0] + state_[3], 23) + state_[0];
        const std::uint64_t shifted = state_[1] << 17;
        state_[2] ^= state_[0];
        state_[3] ^= state_[1];
        state_[1] ^= state_[2];
        state_[0] ^= state_[3];
        state_[2] ^= shifted;
        state_[3] = rotated(state_[3], 45);
        return result;
    }

    /// Above 0 and below 1.
    double uniform() noexcept { return (static_cast<double>(bits() >> 12) + 0.5) * 0x1p-52; }

    /// Mean 0, deviation 1 (Box & Muller 1958).
    double normal() noexcept {
        if (has_spare_) {
            has_spare_ = false;
            return spare_;
        }
        const double radius = std::sqrt(-2.0 * portable_log(uniform()));
        const double turns = uniform();
        spare_ = radius * portable_sin_turns(turns);
        has_spare_ = true;
        return radius * portable_cos_turns(turns);
    }

    /// Mean 0, deviation a little below 1, never further than `most` from 0.
    double normal_within(double most) noexcept {
        double value = normal();
        while (std::abs(value) > most) {
            value = normal();
        }
        return value;
    }

    /// Waiting time of mean `mean`.
    double exponential(double mean) noexcept { return -mean * portable_log(uniform()); }

  private:
    static std::uint64_t rotated(std::uint64_t word, int by) noexcept { return (word << by) | (word >> (64 - by)); }

    std::array<std::uint64_t, 4> state_{};
    double spare_ = 0.0;
    bool has_spare_ = false;
};

} // namespace millpond
