// The same samples give the same decisions whatever the compiler optimised and whatever the processor can do.
#include "support/process.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

std::string digest_by(const std::string& command) {
    const auto ran = test::run(command);
    EXPECT_EQ(ran.status, 0) << command << "\n" << ran.err;
    return ran.out;
}

TEST(Digest, SameDecisionsWithoutAndWithAllOptimisation) {
    const auto plain = digest_by(MILLPOND_DIGEST_O0), optimised = digest_by(MILLPOND_DIGEST_O3);
    EXPECT_EQ(plain, optimised);
    EXPECT_NE(plain.find(" detections"), std::string::npos);
}

// The mathematical functions of the C library choose their code by processor; here it is told to see an older one
// (glibc's documented tunable glibc.cpu.hwcaps).
TEST(Digest, SameDecisionsWithTheMathLibraryOfAnOlderProcessor) {
    const auto here = digest_by(MILLPOND_DIGEST_O3);
    const auto older = digest_by("GLIBC_TUNABLES=glibc.cpu.hwcaps=-AVX512F,-AVX2,-FMA,-FMA4,-AVX " MILLPOND_DIGEST_O3);
    EXPECT_EQ(here, older);
}

} // namespace
} // namespace millpond
