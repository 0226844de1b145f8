// Whether two samples look as if they came from one law: the two-sided two-sample test of Kolmogorov and Smirnov.
// Thread: cold.
//
// D is the greatest distance between the two empirical distribution functions. p is the chance of a D at least as great
// where both come from one continuous law and all values are independent: exact, by counting the orders in which the
// two may be mixed (Hodges 1957, Ark Mat 3:469), up to 10^8 pairs of values; beyond, by the limit law with
// sqrt(n m / (n + m)) D. Equal values, as whole samples give them, make p a little too large.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace millpond {

struct TwoSampleTest {
    std::uint64_t first = 0, second = 0; ///< values in each sample
    double d = 0.0, p = 1.0;
    bool exact = true;

    /// False where a sample is empty: nothing was tested.
    [[nodiscard]] bool known() const noexcept { return first > 0 && second > 0; }
};

/// Pairs of values up to which p is exact; asks for half a second on an ordinary processor.
inline constexpr std::uint64_t most_exact_pairs = 100'000'000;

/// NaN is not allowed among the values.
[[nodiscard]] TwoSampleTest kolmogorov_smirnov(std::vector<double> first, std::vector<double> second);

/// The limit law's chance of more than `lambda`. Source of the series: Smirnov 1948, Ann Math Stat 19:279.
[[nodiscard]] double kolmogorov_tail(double lambda) noexcept;

/// `Kolmogorov-Smirnov, two-sided: D 0.0312, p 0.84 (exact; 120 and 131 intervals, taken as independent)`.
[[nodiscard]] std::string told(const TwoSampleTest& test, const std::string& values);

} // namespace millpond
