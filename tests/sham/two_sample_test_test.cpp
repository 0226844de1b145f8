// The two-sample test against SciPy's ks_2samp, which nobody here wrote.
#include "base/random.hpp"
#include "sham/two_sample_test.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::ask_scipy;

std::vector<double> waits(std::size_t count, double mean, std::uint64_t seed, double step = 0.0) {
    Random random(seed, 0);
    std::vector<double> values;
    for (std::size_t i = 0; i < count; ++i) {
        const double value = random.exponential(mean);
        values.push_back(step > 0.0 ? step * std::round(value / step) : value);
    }
    return values;
}

/// D, and what `p` says, as SciPy has them: exact for samples of up to 10,000.
std::vector<double> of_scipy(std::vector<double> first, const std::vector<double>& second, const std::string& p) {
    const auto n = std::to_string(first.size());
    first.insert(first.end(), second.begin(), second.end());
    return ask_scipy("a, b = x[:" + n + "], x[" + n +
                         ":]\nr = stats.ks_2samp(a, b, method='auto')\ntell([r.statistic, " + p + "])",
                     first);
}

void expect_as_scipy(const std::vector<double>& first, const std::vector<double>& second) {
    const auto expected = of_scipy(first, second, "r.pvalue");
    ASSERT_EQ(expected.size(), 2U);
    const auto test = kolmogorov_smirnov(first, second);
    EXPECT_NEAR(test.d, expected[0], 1e-14);
    EXPECT_NEAR(test.p / expected[1], 1.0, 1e-8) << test.p;
    EXPECT_TRUE(test.exact);
}

TEST(TwoSampleTest, OfSamplesOfOneLawIsAsSciPyHasIt) {
    MILLPOND_NEEDS_SCIPY();
    expect_as_scipy(waits(60, 1.0, 1), waits(47, 1.0, 2));
}

TEST(TwoSampleTest, OfSamplesOfTwoLawsIsAsSciPyHasItDownToSmallChances) {
    MILLPOND_NEEDS_SCIPY();
    expect_as_scipy(waits(150, 1.0, 3), waits(120, 2.5, 4));
    EXPECT_LT(kolmogorov_smirnov(waits(150, 1.0, 3), waits(120, 2.5, 4)).p, 1e-4);
}

TEST(TwoSampleTest, OfEqualValuesIsAsSciPyHasIt) {
    MILLPOND_NEEDS_SCIPY();
    expect_as_scipy(waits(80, 1.0, 5, 0.1), waits(80, 1.3, 6, 0.1));
}

TEST(TwoSampleTest, OfFewValuesIsAsCountedByHand) {
    // {1, 2} before {3, 4}: D 1, as great in 2 of the 6 orders. {1, 3} and {2, 4}: D 1/2, as great in all of them.
    EXPECT_DOUBLE_EQ(kolmogorov_smirnov({1, 2}, {4, 3}).d, 1.0);
    EXPECT_DOUBLE_EQ(kolmogorov_smirnov({1, 2}, {4, 3}).p, 2.0 / 6.0);
    EXPECT_DOUBLE_EQ(kolmogorov_smirnov({1, 3}, {2, 4}).d, 0.5);
    EXPECT_DOUBLE_EQ(kolmogorov_smirnov({1, 3}, {2, 4}).p, 1.0);
}

TEST(TwoSampleTest, OfASampleWithItselfFindsNoDistance) {
    const auto test = kolmogorov_smirnov(waits(500, 1.0, 7), waits(500, 1.0, 7));
    EXPECT_EQ(test.d, 0.0);
    EXPECT_EQ(test.p, 1.0);
}

TEST(TwoSampleTest, OfAnEmptySampleIsNotKnownAndSaysSo) {
    const auto test = kolmogorov_smirnov({}, {1.0});
    EXPECT_FALSE(test.known());
    EXPECT_EQ(told(test, "intervals"), "not tested: 0 and 1 intervals");
}

TEST(TwoSampleTest, OfVeryManyValuesFollowsTheLimitLaw) {
    MILLPOND_NEEDS_SCIPY();
    const auto first = waits(12'000, 1.0, 8), second = waits(9'000, 1.02, 9);
    const auto expected = of_scipy(first, second, "stats.kstwobign.sf(r.statistic * np.sqrt(12000 * 9000 / 21000))");
    const auto test = kolmogorov_smirnov(first, second);
    EXPECT_FALSE(test.exact);
    EXPECT_NEAR(test.d, expected.at(0), 1e-14);
    EXPECT_NEAR(test.p, expected.at(1), 1e-10);
}

TEST(KolmogorovTail, IsAsSciPyHasIt) {
    MILLPOND_NEEDS_SCIPY();
    const std::vector<double> lambdas{0.1, 0.3, 0.5, 0.83, 1.0, 1.36, 2.0, 3.0};
    const auto expected = ask_scipy("tell(stats.kstwobign.sf(x))", lambdas);
    for (std::size_t i = 0; i < lambdas.size(); ++i) {
        EXPECT_NEAR(kolmogorov_tail(lambdas[i]), expected.at(i), 1e-9) << lambdas[i];
    }
}

} // namespace
} // namespace millpond
