#include "detector/minimum_phase.hpp"

#include <algorithm>
#include <bit>
#include <cmath>
#include <complex>
#include <numbers>

namespace millpond {
namespace {

using Spectrum = std::vector<std::complex<double>>;

// Radix-2, decimation in time (Cooley & Tukey 1965). Written out because a library that picks its code by processor
// would give other bits on other machines.
void transform(Spectrum& values, bool inverse) {
    const std::size_t size = values.size();
    for (std::size_t i = 1, j = 0; i < size; ++i) {
        std::size_t bit = size >> 1;
        for (; j & bit; bit >>= 1) {
            j ^= bit;
        }
        j ^= bit;
        if (i < j) {
            std::swap(values[i], values[j]);
        }
    }
    for (std::size_t span = 2; span <= size; span *= 2) {
        for (std::size_t k = 0; k < span / 2; ++k) {
            const double angle = 2.0 * std::numbers::pi * static_cast<double>(k) / static_cast<double>(span);
            const auto turn = std::polar(1.0, inverse ? angle : -angle);
            for (std::size_t start = k; start < size; start += span) {
                const auto odd = turn * values[start + span / 2];
                values[start + span / 2] = values[start] - odd;
                values[start] += odd;
            }
        }
    }
    if (inverse) {
        for (auto& value : values) {
            value /= static_cast<double>(size);
        }
    }
}

} // namespace

std::vector<double> minimum_phase(const std::vector<double>& taps) {
    // The cepstrum is infinitely long; sixteen times the taps keep what folds over below the rounding of the taps.
    const std::size_t size = std::bit_ceil(taps.size() * 16);
    Spectrum values(size);
    std::copy(taps.begin(), taps.end(), values.begin());
    transform(values, false);
    double largest = 0.0;
    for (const auto& value : values) {
        largest = std::max(largest, std::abs(value));
    }
    for (auto& value : values) {
        value = std::log(std::max(std::abs(value), 1e-7 * largest)); // zeros on the unit circle have no logarithm
    }
    transform(values, true);
    for (std::size_t i = 1; i < size / 2; ++i) {
        values[i] *= 2.0;
    }
    std::fill(values.begin() + static_cast<std::ptrdiff_t>(size / 2 + 1), values.end(), 0.0);
    transform(values, false);
    for (auto& value : values) {
        value = std::exp(value);
    }
    transform(values, true);
    std::vector<double> shortest;
    for (std::size_t i = 0; i < taps.size(); ++i) {
        shortest.push_back(values[i].real());
    }
    return shortest;
}

} // namespace millpond
