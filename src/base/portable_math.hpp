// Elementary functions that give the same bits on every machine: the C library's differ from version to version and,
// with fused multiply-add, from processor to processor. Only operations that IEEE 754 rounds correctly are used here.
// Accurate to about 1e-15. Thread: any.
#pragma once

#include <cmath>

namespace millpond {

/// e to the power `x`; 0 below -700.
inline double portable_exp(double x) noexcept {
    if (x < -700.0) {
        return 0.0;
    }
    // ln 2 in two parts, the first with few enough bits that its product with a small integer is exact.
    constexpr double ln2_high = 0.693147180369123816490, ln2_low = 1.90821492927058770002e-10;
    const double twos = std::floor(x * 1.44269504088896340736 + 0.5);
    const double rest = (x - twos * ln2_high) - twos * ln2_low;
    double sum = 1.0;
    for (int term = 14; term > 0; --term) {
        sum = 1.0 + sum * rest / term;
    }
    return std::ldexp(sum, static_cast<int>(twos));
}

/// Natural logarithm of `x` > 0, by ln m = 2 artanh((m - 1) / (m + 1)).
inline double portable_log(double x) noexcept {
    int twos = 0;
    double mantissa = std::frexp(x, &twos);
    if (mantissa < 0.70710678118654752440) {
        mantissa *= 2.0;
        --twos;
    }
    const double s = (mantissa - 1.0) / (mantissa + 1.0);
    double sum = 0.0;
    for (int odd = 23; odd > 0; odd -= 2) {
        sum = 1.0 / odd + sum * s * s;
    }
    return 2.0 * s * sum + twos * 0.693147180559945309417;
}

/// Sine of `turns` full turns.
inline double portable_sin_turns(double turns) noexcept {
    double quarter = turns - std::floor(turns + 0.5);
    if (quarter > 0.25) {
        quarter = 0.5 - quarter;
    } else if (quarter < -0.25) {
        quarter = -0.5 - quarter;
    }
    const double x = 6.28318530717958647693 * quarter;
    constexpr double inverse[] = {1.0 / (2 * 3),   1.0 / (4 * 5),   1.0 / (6 * 7),   1.0 / (8 * 9),  1.0 / (10 * 11),
                                  1.0 / (12 * 13), 1.0 / (14 * 15), 1.0 / (16 * 17), 1.0 / (18 * 19)};
    double sum = 1.0;
    for (int term = 8; term >= 0; --term) {
        sum = 1.0 - sum * x * x * inverse[term];
    }
    return x * sum;
}

inline double portable_cos_turns(double turns) noexcept {
    return portable_sin_turns(turns - std::floor(turns + 0.5) + 0.25);
}

} // namespace millpond
