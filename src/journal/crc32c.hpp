// CRC-32C (Castagnoli): polynomial 0x1EDC6F41, reflected, as in RFC 3720 section 12.1. Thread: all.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>

namespace millpond {

inline constexpr std::array<std::uint32_t, 256> crc32c_table = [] {
    std::array<std::uint32_t, 256> table{};
    for (std::uint32_t byte = 0; byte < 256; ++byte) {
        std::uint32_t rest = byte;
        for (int bit = 0; bit < 8; ++bit) {
            rest = (rest >> 1U) ^ ((rest & 1U) != 0 ? 0x82F63B78U : 0U); // the polynomial with its bits reversed
        }
        table[byte] = rest;
    }
    return table;
}();

[[nodiscard]] constexpr std::uint32_t crc32c(std::span<const std::uint8_t> bytes) noexcept {
    std::uint32_t crc = 0xFFFFFFFFU;
    for (const auto byte : bytes) {
        crc = (crc >> 8U) ^ crc32c_table[(crc ^ byte) & 0xFFU];
    }
    return crc ^ 0xFFFFFFFFU;
}

} // namespace millpond
