#include "base/refusal.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

TEST(Refusal, SaysPlaceFindingAndAllowedInOneLine) {
    const Refusal refusal("rig.yaml:3: stream.port", "'x'", "a whole number from 1 to 65535");
    EXPECT_STREQ(refusal.what(), "rig.yaml:3: stream.port: found 'x'; allowed: a whole number from 1 to 65535");
}

TEST(NearestName, SuggestsTheKnownNameThatIsOneSlipAway) {
    EXPECT_EQ(nearest_name("threshhold", {"floor", "threshold", "vote"}), "threshold");
}

TEST(NearestName, SuggestsNothingForAWordLikeNoOther) {
    EXPECT_EQ(nearest_name("xyzzy", {"floor", "threshold", "vote"}), "");
}

} // namespace
} // namespace millpond
