// The 64-bit NTP time stamp of RFC 5905 (seconds since 1900 and a binary fraction) and UTC since 1970 in ns.
// Thread: all.
#pragma once

#include <cstdint>

namespace millpond {

/// Seconds from 1 January 1900 to 1 January 1970 (RFC 5905, figure 4).
inline constexpr std::int64_t ntp_epoch_to_unix_s = 2'208'988'800;
inline constexpr std::int64_t ntp_era_s = std::int64_t{1} << 32;

/// The era is dropped, as NTP drops it.
constexpr std::uint64_t ntp_from_unix_ns(std::int64_t unix_ns) noexcept {
    constexpr std::int64_t second = 1'000'000'000;
    constexpr std::uint64_t unsigned_second = 1'000'000'000;
    std::int64_t whole = unix_ns / second;
    std::int64_t rest = unix_ns % second;
    if (rest < 0) {
        rest += second;
        --whole;
    }
    const auto seconds = static_cast<std::uint32_t>(whole + ntp_epoch_to_unix_s);
    // Rounded up, so that the way back, which cuts, gives the same ns.
    const auto fraction = ((static_cast<std::uint64_t>(rest) << 32) + unsigned_second - 1) / unsigned_second;
    return (std::uint64_t{seconds} << 32) | fraction;
}

/// Reads the era as RFC 4330, 3 does: top bit set is 1968 to 2036, clear is 2036 to 2104.
constexpr std::int64_t unix_ns_from_ntp(std::uint64_t ntp) noexcept {
    std::int64_t seconds = static_cast<std::int64_t>(ntp >> 32) - ntp_epoch_to_unix_s;
    if ((ntp >> 63) == 0) {
        seconds += ntp_era_s;
    }
    return seconds * 1'000'000'000 + static_cast<std::int64_t>(((ntp & 0xffffffffU) * 1'000'000'000U) >> 32);
}

} // namespace millpond
