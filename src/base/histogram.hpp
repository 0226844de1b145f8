// Latency histogram of fixed memory: exact below 64 ns, then 32 bins for every doubling (3 % wide), up to 2^42 ns.
// Thread: one owner. Allocates: never.
#pragma once

#include "base/units.hpp"

#include <array>
#include <bit>
#include <cstddef>
#include <cstdint>

namespace millpond {

class LatencyHistogram {
  public:
    static constexpr std::uint32_t bin_count = 64 + 36 * 32;

    /// Bin of a latency; negative ones (clocks that disagree) go to bin 0, those beyond the last bin into it.
    static constexpr std::uint32_t bin_of(std::int64_t ns) noexcept {
        if (ns < 0) {
            return 0;
        }
        const auto value = static_cast<std::uint64_t>(ns);
        if (value < 64) {
            return static_cast<std::uint32_t>(value);
        }
        const auto doubling = static_cast<std::uint32_t>(std::bit_width(value)) - 7; // 64..127 is doubling 0
        const auto within = static_cast<std::uint32_t>(value >> (doubling + 1)) & 31U;
        const std::uint32_t bin = 64 + doubling * 32 + within;
        return bin < bin_count ? bin : bin_count - 1;
    }

    /// Largest latency that falls into `bin`: a percentile read from it is never too good.
    static constexpr std::int64_t upper_ns(std::uint32_t bin) noexcept {
        if (bin < 64) {
            return bin;
        }
        const std::uint32_t doubling = (bin - 64) / 32;
        const std::uint64_t within = (bin - 64) % 32;
        return static_cast<std::int64_t>(((32 + within + 1) << (doubling + 1)) - 1);
    }

    void add(std::int64_t ns) noexcept {
        add_bin(bin_of(ns), 1);
        max_ns_ = ns > max_ns_ ? ns : max_ns_;
    }

    /// Adds `count` at once, as read back from a session; the maximum is then the bin's upper end.
    void add_bin(std::uint32_t bin, std::uint64_t count) noexcept {
        if (bin >= bin_count || count == 0) {
            return;
        }
        counts_[bin] += count;
        total_ += count;
        top_bin_ = bin > top_bin_ ? bin : top_bin_;
    }

    [[nodiscard]] std::uint64_t count() const noexcept { return total_; }
    [[nodiscard]] std::uint64_t count_in(std::uint32_t bin) const noexcept { return counts_[bin]; }

    /// Upper end of the bin in which the share `q` (0 to 1) of all latencies is reached; 0 where there are none.
    [[nodiscard]] std::int64_t quantile_ns(double q) const noexcept {
        const double wanted = q * static_cast<double>(total_);
        std::uint64_t seen = 0;
        for (std::uint32_t bin = 0; bin < bin_count; ++bin) {
            seen += counts_[bin];
            if (seen > 0 && static_cast<double>(seen) >= wanted) {
                return upper_ns(bin);
            }
        }
        return 0;
    }

    /// Largest latency added; exact for `add`, the bin's upper end for `add_bin`.
    [[nodiscard]] std::int64_t max_ns() const noexcept {
        if (total_ == 0) {
            return 0;
        }
        return bin_of(max_ns_) == top_bin_ ? max_ns_ : upper_ns(top_bin_);
    }

  private:
    std::array<std::uint64_t, bin_count> counts_{};
    std::uint64_t total_ = 0;
    std::int64_t max_ns_ = 0;
    std::uint32_t top_bin_ = 0;
};

} // namespace millpond
