#include "intake/sample_format.hpp"

#include <gtest/gtest.h>

#include <bit>
#include <cmath>
#include <limits>
#include <vector>

namespace millpond {
namespace {

using Bytes = std::vector<std::uint8_t>;

std::vector<float> decoded(SampleEncoding encoding, const Bytes& bytes, float scale) {
    std::vector<float> microvolts(bytes.size() / bytes_per_sample(encoding));
    decode_samples(encoding, bytes, scale, microvolts);
    return microvolts;
}

Bytes encoded(SampleEncoding encoding, const std::vector<float>& microvolts, float scale, EncodeLosses& losses) {
    Bytes bytes(microvolts.size() * bytes_per_sample(encoding));
    encode_samples(encoding, microvolts, scale, bytes, losses);
    return bytes;
}

// RFC 3551, 4.5.11: 16-bit signed two's complement in network byte order.
TEST(SampleFormat, L16IsTwosComplementMostSignificantByteFirst) {
    EXPECT_EQ(decoded(SampleEncoding::l16, {0x00, 0x01, 0xFF, 0xFF, 0x7F, 0xFF, 0x80, 0x00, 0x12, 0x34}, 1.0F),
              (std::vector<float>{1, -1, 32767, -32768, 0x1234}));
}

// RFC 3190, 4: 24 bits likewise. All lengths, since the last sample is read apart.
TEST(SampleFormat, L24ExtendsItsSign) {
    const Bytes all{0x00, 0x00, 0x01, 0xFF, 0xFF, 0xFF, 0x7F, 0xFF, 0xFF, 0x80, 0x00, 0x00, 0x12, 0x34, 0x56};
    const std::vector<float> values{1, -1, 8388607, -8388608, 0x123456};
    for (std::size_t count = 0; count <= values.size(); ++count) {
        EXPECT_EQ(
            decoded(SampleEncoding::l24, {all.begin(), all.begin() + static_cast<std::ptrdiff_t>(3 * count)}, 1.0F),
            std::vector<float>(values.begin(), values.begin() + static_cast<std::ptrdiff_t>(count)));
    }
}

TEST(SampleFormat, PipesAreLeastSignificantByteFirst) {
    EXPECT_EQ(decoded(SampleEncoding::int16, {0x34, 0x12, 0x00, 0x80}, 2.0F), (std::vector<float>{0x2468, -65536}));
    EXPECT_EQ(decoded(SampleEncoding::float32, {0x00, 0x00, 0xC0, 0x3F}, 2.0F), (std::vector<float>{3.0F}));
}

TEST(SampleFormat, EveryL16CountComesBackAsTheSameBitsAfterOneMultiplication) {
    for (const float scale : {0.1F, 0.195F, 1.0F, 0.0305F, 7.3F}) {
        Bytes all;
        for (int count = -32768; count <= 32767; ++count) {
            all.push_back(static_cast<std::uint8_t>((count >> 8) & 0xff));
            all.push_back(static_cast<std::uint8_t>(count & 0xff));
        }
        const auto microvolts = decoded(SampleEncoding::l16, all, scale);
        EXPECT_EQ(microvolts[32768 + 1000], 1000.0F * scale);
        EncodeLosses losses;
        EXPECT_EQ(encoded(SampleEncoding::l16, microvolts, scale, losses), all);
        EXPECT_EQ(losses.clipped, 0U);
    }
}

TEST(SampleFormat, L24CountsComeBackUpToTheEndsOfTheirRange) {
    for (const float scale : {0.1F, 0.195F, 0.00298F}) {
        Bytes some;
        for (int count = -8388608; count <= 8388607; count += 65535 / 7) {
            for (const int shift : {16, 8, 0}) {
                some.push_back(static_cast<std::uint8_t>((count >> shift) & 0xff));
            }
        }
        some.insert(some.end(), {0x7F, 0xFF, 0xFF});
        EncodeLosses losses;
        EXPECT_EQ(encoded(SampleEncoding::l24, decoded(SampleEncoding::l24, some, scale), scale, losses), some);
        EXPECT_EQ(losses.clipped, 0U);
    }
}

TEST(SampleFormat, SamplesBeyondTheRangeAreSentAsItsEndAndCounted) {
    EncodeLosses losses;
    EXPECT_EQ(encoded(SampleEncoding::l16, {32767.4F, 32768.0F, -32768.4F, -1e9F}, 1.0F, losses),
              (Bytes{0x7F, 0xFF, 0x7F, 0xFF, 0x80, 0x00, 0x80, 0x00}));
    EXPECT_EQ(losses.clipped, 2U);
}

TEST(SampleFormat, WhatIsNoNumberIsSentAsZeroAndCounted) {
    EncodeLosses losses;
    EXPECT_EQ(encoded(SampleEncoding::l16,
                      {std::numeric_limits<float>::quiet_NaN(), std::numeric_limits<float>::infinity()}, 1.0F, losses),
              (Bytes{0, 0, 0, 0}));
    EXPECT_EQ(losses.non_finite, 2U);
    EXPECT_EQ(losses.clipped, 0U);
}

} // namespace
} // namespace millpond
