#include "sham/two_sample_test.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>

namespace millpond {
namespace {

// The greatest distance of the two distribution functions times n m, a whole number.
std::int64_t greatest_distance(const std::vector<double>& first, const std::vector<double>& second) {
    const auto n = static_cast<std::int64_t>(first.size()), m = static_cast<std::int64_t>(second.size());
    std::int64_t greatest = 0;
    std::size_t i = 0, j = 0;
    while (i < first.size() && j < second.size()) {
        const double value = std::min(first[i], second[j]);
        while (i < first.size() && first[i] == value) {
            ++i;
        }
        while (j < second.size() && second[j] == value) {
            ++j;
        }
        greatest = std::max(greatest, std::abs(static_cast<std::int64_t>(i) * m - static_cast<std::int64_t>(j) * n));
    }
    return greatest;
}

// Chance that the path of a random mixture of n and m values gets as far as `distance` from the diagonal. reached[j] is
// that chance among the paths to (i, j), of which i / (i + j) came from (i - 1, j).
double exact_p(std::int64_t n, std::int64_t m, std::int64_t distance) {
    std::vector<double> reached(static_cast<std::size_t>(m) + 1, 0.0);
    for (std::int64_t i = 0; i <= n; ++i) {
        for (std::int64_t j = 0; j <= m; ++j) {
            auto& here = reached[static_cast<std::size_t>(j)];
            if (std::abs(i * m - j * n) >= distance) {
                here = 1.0;
            } else if (i + j > 0) {
                const double left = j > 0 ? reached[static_cast<std::size_t>(j) - 1] : 0.0;
                here = (static_cast<double>(i) * (i > 0 ? here : 0.0) + static_cast<double>(j) * left) /
                       static_cast<double>(i + j);
            }
        }
    }
    return reached.back();
}

} // namespace

double kolmogorov_tail(double lambda) noexcept {
    if (lambda < 0.2) {
        return 1.0; // to 10 digits
    }
    double sum = 0.0;
    for (int k = 1; k <= 40; ++k) {
        sum += (k % 2 == 1 ? 2.0 : -2.0) * std::exp(-2.0 * k * k * lambda * lambda);
    }
    return std::clamp(sum, 0.0, 1.0);
}

TwoSampleTest kolmogorov_smirnov(std::vector<double> first, std::vector<double> second) {
    TwoSampleTest test;
    test.first = first.size();
    test.second = second.size();
    if (!test.known()) {
        return test;
    }
    std::sort(first.begin(), first.end());
    std::sort(second.begin(), second.end());
    const auto distance = greatest_distance(first, second);
    const auto n = static_cast<std::int64_t>(first.size()), m = static_cast<std::int64_t>(second.size());
    const double pairs = static_cast<double>(n) * static_cast<double>(m);
    test.d = static_cast<double>(distance) / pairs;
    test.exact = pairs <= static_cast<double>(most_exact_pairs);
    test.p = test.exact ? (distance == 0 ? 1.0 : exact_p(n, m, distance))
                        : kolmogorov_tail(test.d * std::sqrt(pairs / static_cast<double>(n + m)));
    return test;
}

std::string told(const TwoSampleTest& test, const std::string& values) {
    if (!test.known()) {
        return fmt::format("not tested: {} and {} {}", test.first, test.second, values);
    }
    return fmt::format("Kolmogorov-Smirnov, two-sided: D {:.4f}, p {:.3g} ({}; {} and {} {}, taken as independent)",
                       test.d, test.p, test.exact ? "exact" : "limit law", test.first, test.second, values);
}

} // namespace millpond
