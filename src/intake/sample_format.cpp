#include "intake/sample_format.hpp"

#include <algorithm>
#include <bit>
#include <cassert>
#include <cmath>
#include <cstring>

namespace millpond {
namespace {

static_assert(std::endian::native == std::endian::little, "byte order below is written for x86-64");

// Plain loops over fixed-size loads: the compiler turns the first two into vector shuffles and conversions.
void decode_l16(const std::uint8_t* in, float scale, float* out, std::size_t count) noexcept {
    for (std::size_t i = 0; i < count; ++i) {
        std::uint16_t big;
        std::memcpy(&big, in + 2 * i, sizeof big);
        const auto swapped = static_cast<std::uint16_t>((big << 8) | (big >> 8));
        out[i] = static_cast<float>(static_cast<std::int16_t>(swapped)) * scale;
    }
}

void decode_int16(const std::uint8_t* in, float scale, float* out, std::size_t count) noexcept {
    for (std::size_t i = 0; i < count; ++i) {
        std::int16_t value;
        std::memcpy(&value, in + 2 * i, sizeof value);
        out[i] = static_cast<float>(value) * scale;
    }
}

std::int32_t from_big_endian24(std::uint32_t word_with_one_byte_more) noexcept {
    return static_cast<std::int32_t>(__builtin_bswap32(word_with_one_byte_more)) >> 8; // arithmetic: extends the sign
}

void decode_l24(const std::uint8_t* in, float scale, float* out, std::size_t count) noexcept {
    for (std::size_t i = 0; i + 1 < count; ++i) { // four bytes at once, all but the last sample have a byte behind
        std::uint32_t word;
        std::memcpy(&word, in + 3 * i, sizeof word);
        out[i] = static_cast<float>(from_big_endian24(word)) * scale;
    }
    if (count > 0) {
        std::uint32_t word = 0;
        std::memcpy(&word, in + 3 * (count - 1), 3);
        out[count - 1] = static_cast<float>(from_big_endian24(word)) * scale;
    }
}

void decode_float32(const std::uint8_t* in, float scale, float* out, std::size_t count) noexcept {
    for (std::size_t i = 0; i < count; ++i) {
        float value;
        std::memcpy(&value, in + 4 * i, sizeof value);
        out[i] = value * scale;
    }
}

long count_of(float microvolts, float scale, long greatest, EncodeLosses& losses) noexcept {
    if (!std::isfinite(microvolts)) {
        ++losses.non_finite;
        return 0;
    }
    const double exact = static_cast<double>(microvolts) / static_cast<double>(scale);
    const auto least = static_cast<double>(-greatest - 1);
    const double rounded = std::round(exact);
    if (rounded < least || rounded > static_cast<double>(greatest)) {
        ++losses.clipped;
    }
    return std::lround(std::clamp(rounded, least, static_cast<double>(greatest)));
}

} // namespace

void decode_samples(SampleEncoding encoding, std::span<const std::uint8_t> bytes, float microvolts_per_count,
                    std::span<float> microvolts) noexcept {
    assert(bytes.size() == microvolts.size() * bytes_per_sample(encoding));
    switch (encoding) {
    case SampleEncoding::l16:
        return decode_l16(bytes.data(), microvolts_per_count, microvolts.data(), microvolts.size());
    case SampleEncoding::l24:
        return decode_l24(bytes.data(), microvolts_per_count, microvolts.data(), microvolts.size());
    case SampleEncoding::int16:
        return decode_int16(bytes.data(), microvolts_per_count, microvolts.data(), microvolts.size());
    case SampleEncoding::float32:
        return decode_float32(bytes.data(), microvolts_per_count, microvolts.data(), microvolts.size());
    case SampleEncoding::from_sdp:
        assert(false);
    }
}

void encode_samples(SampleEncoding encoding, std::span<const float> microvolts, float microvolts_per_count,
                    std::span<std::uint8_t> bytes, EncodeLosses& losses) noexcept {
    assert(encoding == SampleEncoding::l16 || encoding == SampleEncoding::l24);
    const std::size_t width = bytes_per_sample(encoding);
    assert(bytes.size() == microvolts.size() * width);
    const long greatest = encoding == SampleEncoding::l16 ? 0x7fff : 0x7fffff;
    for (std::size_t i = 0; i < microvolts.size(); ++i) {
        const auto count = static_cast<std::uint64_t>(count_of(microvolts[i], microvolts_per_count, greatest, losses));
        for (std::size_t byte = 0; byte < width; ++byte) {
            bytes[i * width + byte] = static_cast<std::uint8_t>(count >> (8 * (width - 1 - byte)));
        }
    }
}

} // namespace millpond
