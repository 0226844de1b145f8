// What benches share: signals, medians, a peer's output. Thread: bench.
#pragma once

#include "base/clock.hpp"

#include <algorithm>
#include <cstdint>
#include <cstdio>
#include <stdexcept>
#include <string>
#include <vector>

namespace millpond::bench {

inline double median(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    return values.empty() ? 0.0 : values[values.size() / 2];
}
inline double least(const std::vector<double>& values) {
    return *std::min_element(values.begin(), values.end());
}
inline double most(const std::vector<double>& values) {
    return *std::max_element(values.begin(), values.end());
}

/// Near-Gaussian noise (sum of four uniforms), the same every time.
inline std::vector<float> noise(std::size_t count, double sd) {
    std::vector<float> values(count);
    std::uint64_t state = 88172645463325252ULL; // xorshift64, Marsaglia 2003
    for (float& value : values) {
        double sum = -2.0;
        for (int i = 0; i < 4; ++i) {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            sum += static_cast<double>(state >> 11) * 0x1.0p-53;
        }
        value = static_cast<float>(sum * 1.7320508 * sd);
    }
    return values;
}

/// What `command` prints; throws where it fails.
inline std::string output_of(const std::string& command) {
    FILE* pipe = popen(command.c_str(), "r");
    if (pipe == nullptr) {
        throw std::runtime_error("cannot run " + command);
    }
    std::string text;
    char chunk[4096];
    for (std::size_t got = 0; (got = fread(chunk, 1, sizeof chunk, pipe)) > 0;) {
        text.append(chunk, got);
    }
    if (pclose(pipe) != 0) {
        throw std::runtime_error("failed: " + command);
    }
    return text;
}

} // namespace millpond::bench
