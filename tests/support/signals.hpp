// Signals made up for tests, the same on every machine. Thread: test.
#pragma once

#include "base/frames.hpp"
#include "base/random.hpp"

#include <cmath>
#include <cstdint>
#include <numbers>
#include <vector>

namespace millpond::test {

/// The sum of twelve uniforms: near enough to Gaussian for a test.
class Noise {
  public:
    explicit Noise(std::uint64_t seed) : words_(seed) {}
    double uniform() { return static_cast<double>(words_.next() >> 11) * 0x1.0p-53; }
    double gaussian() {
        double sum = -6.0;
        for (int i = 0; i < 12; ++i) {
            sum += uniform();
        }
        return sum;
    }

  private:
    SplitMix64 words_;
};

/// White noise of `sd_uv`, independent in every channel.
inline std::vector<float> white_noise(std::size_t frames, std::size_t channels, double sd_uv, std::uint64_t seed) {
    Noise noise(seed);
    std::vector<float> data(frames * channels);
    for (float& value : data) {
        value = static_cast<float>(sd_uv * noise.gaussian());
    }
    return data;
}

/// Adds a burst of `hz` with a raised-cosine outline to every channel of [from, from + length).
inline void add_burst(std::vector<float>& data, std::size_t channels, std::size_t from, std::size_t length, double rate,
                      double hz, double peak_uv) {
    for (std::size_t i = 0; i < length; ++i) {
        const double outline =
            0.5 - 0.5 * std::cos(2.0 * std::numbers::pi * static_cast<double>(i) / static_cast<double>(length));
        const double value = peak_uv * outline * std::sin(2.0 * std::numbers::pi * hz * static_cast<double>(i) / rate);
        for (std::size_t c = 0; c < channels; ++c) {
            data[(from + i) * channels + c] += static_cast<float>(value);
        }
    }
}

inline FrameBlock block_of(const std::vector<float>& data, std::size_t channels, std::uint64_t first = 0) {
    return {SampleIndex{first}, channels, data};
}

} // namespace millpond::test
