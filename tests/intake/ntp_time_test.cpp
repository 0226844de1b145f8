#include "intake/ntp_time.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

constexpr std::int64_t second = 1'000'000'000;

// RFC 5905, figure 4: 1 January 1970 is second 2,208,988,800 of era 0.
TEST(NtpTime, UnixEpochIsTheSecondThatRfc5905Says) {
    EXPECT_EQ(ntp_from_unix_ns(0), std::uint64_t{2'208'988'800} << 32);
    EXPECT_EQ(unix_ns_from_ntp(std::uint64_t{2'208'988'800} << 32), 0);
}

// RFC 5905, figure 4: 8 February 2036 is second 63,104 of era 1; that day began 2,086,041,600 s after 1970
// (date -u -d 2036-02-08 +%s).
TEST(NtpTime, EraOneBeginsInFebruary2036) {
    EXPECT_EQ(ntp_from_unix_ns(2'086'041'600 * second), std::uint64_t{63'104} << 32);
    EXPECT_EQ(unix_ns_from_ntp(std::uint64_t{63'104} << 32), 2'086'041'600 * second);
    EXPECT_EQ(unix_ns_from_ntp(0), (2'086'041'600 - 63'104) * second);
    EXPECT_EQ(unix_ns_from_ntp(~std::uint64_t{0}), (2'086'041'600 - 63'104) * second - 1);
}

TEST(NtpTime, FractionIsBinary) {
    EXPECT_EQ(ntp_from_unix_ns(second / 2) & 0xffffffffU, 0x80000000U);
    EXPECT_EQ(unix_ns_from_ntp((std::uint64_t{2'208'988'800} << 32) | 0x40000000U), second / 4);
}

TEST(NtpTime, EveryNanosecondComesBackUnchanged) {
    for (const std::int64_t ns : {std::int64_t{1}, second - 1, 1'796'118'000 * second + 123'456'789,
                                  2'086'041'600 * second + 999'999'999, std::int64_t{-1}}) {
        EXPECT_EQ(unix_ns_from_ntp(ntp_from_unix_ns(ns)), ns);
    }
    for (std::int64_t ns = 0; ns < second; ns += 999'983) {
        EXPECT_EQ(unix_ns_from_ntp(ntp_from_unix_ns(ns)), ns);
    }
}

} // namespace
} // namespace millpond
