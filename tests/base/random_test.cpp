#include "base/random.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

// Against the C library, whose error is below 1 unit in the last place (glibc manual).
TEST(PortableMath, AgreesWithTheCLibrary) {
    for (int i = -20'000; i <= 20'000; ++i) {
        const double x = i / 311.0;
        ASSERT_NEAR(portable_exp(x) / std::exp(x), 1.0, 2e-14) << x;
        ASSERT_NEAR(portable_sin_turns(x), std::sin(2.0 * M_PI * std::remainder(x, 1.0)), 1e-14) << x;
        ASSERT_NEAR(portable_cos_turns(x), std::cos(2.0 * M_PI * std::remainder(x, 1.0)), 1e-14) << x;
        const double y = std::exp2(i / 40.0);
        ASSERT_NEAR(portable_log(y), std::log(y), 4e-16 * std::max(1.0, std::abs(std::log(y)))) << y;
    }
    EXPECT_EQ(portable_exp(-1000.0), 0.0);
}

TEST(SplitMix64, GivesTheWidelyPrintedNumbersOfSeed1234567) {
    SplitMix64 random(1234567); // from memory: the numbers that published ports of the algorithm check themselves by
    EXPECT_EQ(random.next(), 6457827717110365317U);
    EXPECT_EQ(random.next(), 3203168211198807973U);
    EXPECT_EQ(random.next(), 9817491932198370423U);
}

TEST(Random, SameSeedAndStreamGiveTheSameNumbers) {
    Random a(7, 1);
    Random b(7, 1);
    for (int i = 0; i < 100; ++i) {
        ASSERT_EQ(a.bits(), b.bits());
    }
}

// Worked out apart from this code, in Python's whole numbers, from the published definitions of both generators.
TEST(Random, IsXoshiro256PlusPlusSeededBySplitmix64) {
    const std::string program = R"(m = (1 << 64) - 1
def splitmix(s):
    s = (s + 0x9E3779B97F4A7C15) & m
    z = s
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & m
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & m
    return s, z ^ (z >> 31)
def rotl(x, k): return ((x << k) | (x >> (64 - k))) & m
_, state = splitmix(42)
state ^= 3
s = []
for _ in range(4):
    state, word = splitmix(state)
    s.append(word)
for _ in range(1000):
    result = (rotl((s[0] + s[3]) & m, 23) + s[0]) & m
    t = (s[1] << 17) & m
    s[2] ^= s[0]; s[3] ^= s[1]; s[1] ^= s[2]; s[0] ^= s[3]; s[2] ^= t; s[3] = rotl(s[3], 45)
print(result)
)";
    Random random(42, 3);
    std::uint64_t last = 0;
    for (int i = 0; i < 1000; ++i) {
        last = random.bits();
    }
    EXPECT_EQ(test::python(program), std::to_string(last) + "\n");
}

TEST(Random, StreamsOfOneSeedAreUnrelated) {
    Random a(1, 1);
    Random b(1, 2);
    double product = 0.0;
    for (int i = 0; i < 10'000; ++i) {
        product += a.normal() * b.normal();
    }
    EXPECT_LT(std::abs(product) / 10'000.0, 4.0 / std::sqrt(10'000.0));
}

// SciPy's Kolmogorov-Smirnov test; the seed is fixed, so the outcome is too.
TEST(Random, LawsAreNormalUniformAndExponentialToSciPy) {
    MILLPOND_NEEDS_SCIPY();
    Random random(2, 2);
    std::vector<float> values;
    for (int i = 0; i < 50'000; ++i) {
        values.push_back(static_cast<float>(random.normal()));
        values.push_back(static_cast<float>(random.uniform()));
        values.push_back(static_cast<float>(random.exponential(2.0)));
    }
    const auto p =
        test::ask_scipy("print(stats.kstest(x[:,0], 'norm').pvalue, stats.kstest(x[:,1], 'uniform').pvalue,"
                        " stats.kstest(x[:,2], 'expon', (0, 2)).pvalue, np.corrcoef(x[:-1,0], x[1:,0])[0,1])",
                        values, 3);
    ASSERT_EQ(p.size(), 4u);
    EXPECT_GT(p[0], 0.01);
    EXPECT_GT(p[1], 0.01);
    EXPECT_GT(p[2], 0.01);
    EXPECT_LT(std::abs(p[3]), 0.02);
}

} // namespace
} // namespace millpond
