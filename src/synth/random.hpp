// Random numbers that are the same on every machine. Thread: one owner each.
#pragma once

#include "synth/portable_math.hpp"

#include <array>
#include <cstdint>

namespace millpond {

/// xoshiro256++ (Blackman & Vigna 2019), its state filled by splitmix64 (Steele, Lea & Flood 2014) from a seed and the
/// number of a stream. Each element of a scene has streams of its own, so that a new element changes no other.
class Random {
  public:
    Random(std::uint64_t seed, std::uint64_t stream) noexcept {
        std::uint64_t state = seed;
        state = splitmix(state) ^ stream;
        for (auto& word : state_) {
            word = splitmix(state);
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
    static std::uint64_t splitmix(std::uint64_t& state) noexcept {
        state += 0x9E3779B97F4A7C15u;
        std::uint64_t mixed = state;
        mixed = (mixed ^ (mixed >> 30)) * 0xBF58476D1CE4E5B9u;
        mixed = (mixed ^ (mixed >> 27)) * 0x94D049BB133111EBu;
        return mixed ^ (mixed >> 31);
    }
    static std::uint64_t rotated(std::uint64_t word, int by) noexcept { return (word << by) | (word >> (64 - by)); }

    std::array<std::uint64_t, 4> state_{};
    double spare_ = 0.0;
    bool has_spare_ = false;
};

} // namespace millpond
