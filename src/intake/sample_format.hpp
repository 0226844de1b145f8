// How samples stand in the bytes of a packet or a pipe, and their way to microvolts and back.
// Thread: all. Allocates, locks, throws: never.
#pragma once

#include "base/describe.hpp"

#include <cstddef>
#include <cstdint>
#include <span>

namespace millpond {

enum class SampleEncoding : std::uint8_t {
    from_sdp, ///< not said here: the SDP file says it
    l16,      ///< 16-bit two's complement, most significant byte first (RFC 3551, 4.5.11)
    l24,      ///< 24-bit two's complement, most significant byte first (RFC 3190, 4)
    int16,    ///< 16-bit two's complement, least significant byte first
    float32   ///< IEEE 754 single precision, least significant byte first
};
inline constexpr Choice<SampleEncoding> sample_encodings[] = {{SampleEncoding::from_sdp, "from_sdp"},
                                                              {SampleEncoding::l16, "L16"},
                                                              {SampleEncoding::l24, "L24"},
                                                              {SampleEncoding::int16, "int16"},
                                                              {SampleEncoding::float32, "float32"}};

/// 0 for from_sdp.
constexpr std::size_t bytes_per_sample(SampleEncoding encoding) noexcept {
    constexpr std::size_t bytes[] = {0, 2, 3, 2, 4};
    return bytes[static_cast<std::size_t>(encoding)];
}

/// Microvolts: float(count) * microvolts_per_count, one single-precision multiplication a sample.
/// `bytes` holds exactly `microvolts.size()` samples.
void decode_samples(SampleEncoding encoding, std::span<const std::uint8_t> bytes, float microvolts_per_count,
                    std::span<float> microvolts) noexcept;

/// What did not fit into the integers.
struct EncodeLosses {
    std::uint64_t clipped = 0;    ///< samples beyond the range, sent as its end
    std::uint64_t non_finite = 0; ///< samples that are no number, sent as 0
};

/// Counts: lround(microvolts / microvolts_per_count), so that what decode_samples made comes back as the same bits.
/// l16 and l24 only. Adds to `losses`.
void encode_samples(SampleEncoding encoding, std::span<const float> microvolts, float microvolts_per_count,
                    std::span<std::uint8_t> bytes, EncodeLosses& losses) noexcept;

} // namespace millpond
