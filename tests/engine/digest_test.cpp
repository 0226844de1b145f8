// The same samples give the same decisions whatever the compiler optimised and whatever the processor can do.
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

TEST(Digest, SameDecisionsWithoutAndWithAllOptimisation) {
    const auto plain = test::output_of(MILLPOND_DIGEST_O0), optimised = test::output_of(MILLPOND_DIGEST_O3);
    EXPECT_EQ(plain, optimised);
    EXPECT_NE(plain.find(" detections"), std::string::npos);
}

// The mathematical functions of the C library choose their code by processor; here it is told to see an older one
// (glibc's documented tunable glibc.cpu.hwcaps).
TEST(Digest, SameDecisionsWithTheMathLibraryOfAnOlderProcessor) {
    const auto here = test::output_of(MILLPOND_DIGEST_O3);
    const auto older =
        test::output_of("GLIBC_TUNABLES=glibc.cpu.hwcaps=-AVX512F,-AVX2,-FMA,-FMA4,-AVX " MILLPOND_DIGEST_O3);
    EXPECT_EQ(here, older);
}

} // namespace
} // namespace millpond
