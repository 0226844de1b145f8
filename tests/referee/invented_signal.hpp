// Noise with ripples put into it, in memory. For the tests of the referee.
#pragma once

#include "base/frames.hpp"

#include <cmath>
#include <cstdint>
#include <numbers>
#include <vector>

namespace millpond::test {

// Splitmix64 by Steele, Lea and Flood 2014, summed to something near Gaussian: a noise floor that is the same
// everywhere.
class Noise {
  public:
    double next() {
        double sum = 0.0;
        for (int i = 0; i < 12; ++i) {
            state_ += 0x9E3779B97F4A7C15U;
            std::uint64_t z = state_;
            z = (z ^ (z >> 30U)) * 0xBF58476D1CE4E5B9U;
            z = (z ^ (z >> 27U)) * 0x94D049BB133111EBU;
            sum += static_cast<double>((z ^ (z >> 31U)) >> 11U) * 0x1.0p-53;
        }
        return sum - 6.0;
    }

  private:
    std::uint64_t state_ = 7;
};

struct Signal {
    Hertz rate;
    std::size_t channels = 1;
    std::vector<float> data;

    Signal(Hertz rate_hz, std::size_t channel_count, double seconds)
        : rate(rate_hz), channels(channel_count),
          data(static_cast<std::size_t>(seconds * rate_hz.value) * channel_count) {}

    void add_noise(double deviation) {
        Noise noise;
        for (auto& value : data) {
            value += static_cast<float>(deviation * noise.next());
        }
    }

    // A ripple of 180 Hz under a Gaussian hull of SD `hull_ms`, on the channels from `first` on.
    void add_ripple(double at_s, double amplitude, double hull_ms = 20.0, std::size_t first = 0) {
        for (std::size_t f = 0; f < data.size() / channels; ++f) {
            const double t = static_cast<double>(f) / rate.value - at_s;
            const double z = t * 1000.0 / hull_ms;
            if (std::abs(z) > 8.0) {
                continue; // 1e-14 of it
            }
            const double value = amplitude * std::exp(-0.5 * z * z) * std::cos(2.0 * std::numbers::pi * 180.0 * t);
            for (std::size_t c = first; c < channels; ++c) {
                data[f * channels + c] += static_cast<float>(value);
            }
        }
    }

    [[nodiscard]] FrameBlock block() const { return {SampleIndex{0}, channels, data}; }
};

} // namespace millpond::test
