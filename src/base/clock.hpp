// The two clocks, read where a latency part begins or ends. Thread: all; a vdso read, neither allocates nor blocks.
#pragma once

#include "base/units.hpp"

#include <ctime>

namespace millpond {

inline Nanos read_clock(clockid_t id) noexcept {
    timespec now{};
    clock_gettime(id, &now);
    return std::chrono::seconds{now.tv_sec} + Nanos{now.tv_nsec};
}

/// For durations inside this computer; never set back.
inline Nanos monotonic_now() noexcept {
    return read_clock(CLOCK_MONOTONIC);
}

/// UTC since 1970: what kernel receive stamps, NTP send times and the session's records carry.
inline Nanos realtime_now() noexcept {
    return read_clock(CLOCK_REALTIME);
}

} // namespace millpond
