#include "base/spsc_ring.hpp"
#include "journal/sample_ring.hpp"

#include <gtest/gtest.h>

#include <numeric>
#include <thread>

namespace millpond {
namespace {

TEST(SpscRing, FullRingRefusesAndCounts) {
    SpscRing<int> ring(4);
    for (int i = 0; i < 4; ++i) {
        EXPECT_EQ(ring.push(i), PushOutcome::stored);
    }
    EXPECT_EQ(ring.push(4), PushOutcome::dropped_full);
    EXPECT_EQ(ring.push(5), PushOutcome::dropped_full);
    EXPECT_EQ(ring.dropped(), 2U);
    int value = -1;
    EXPECT_TRUE(ring.pop(value));
    EXPECT_EQ(value, 0);
    EXPECT_EQ(ring.push(6), PushOutcome::stored);
}

TEST(SpscRing, CapacityIsRoundedUpToAPowerOfTwo) {
    EXPECT_EQ(SpscRing<int>(5).capacity(), 8U);
}

TEST(SpscRing, TwoThreadsHandOverEveryStoredValueInOrder) {
    struct Wide {
        std::uint64_t number, twice, thrice, inverse;
    };
    constexpr std::uint64_t count = 400'000;
    SpscRing<Wide> ring(256);
    std::uint64_t stored = 0;
    std::thread producer([&] {
        for (std::uint64_t i = 1; i <= count; ++i) {
            while (ring.push({i, 2 * i, 3 * i, ~i}) != PushOutcome::stored) {
                std::this_thread::yield();
            }
            ++stored;
        }
    });
    std::uint64_t last = 0;
    bool whole = true;
    while (last < count) {
        Wide value{};
        if (!ring.pop(value)) {
            std::this_thread::yield();
            continue;
        }
        whole = whole && value.number == last + 1 && value.twice == 2 * value.number &&
                value.thrice == 3 * value.number && value.inverse == ~value.number;
        last = value.number;
    }
    producer.join();
    EXPECT_TRUE(whole);
    EXPECT_EQ(stored, count);
}

TEST(SampleRing, BlocksComeBackWholeAcrossTheEndOfTheRing) {
    SampleRing ring(64, 8);
    std::vector<float> out;
    SampleIndex first{};
    float next = 0.0F;
    for (std::uint64_t round = 0; round < 50; ++round) {
        std::vector<float> block(14);
        std::iota(block.begin(), block.end(), next);
        next += 14.0F;
        ASSERT_EQ(ring.push({SampleIndex{round * 7}, 2, block}), PushOutcome::stored);
        ASSERT_TRUE(ring.pop(first, out));
        EXPECT_EQ(first.value, round * 7);
        EXPECT_EQ(out, block);
    }
    EXPECT_FALSE(ring.pop(first, out));
}

TEST(SampleRing, FullRingDropsTheWholeBlockCountsItsFramesAndRemembersThePlace) {
    SampleRing ring(16, 8);
    const std::vector<float> block(12, 1.0F);
    EXPECT_EQ(ring.push({SampleIndex{0}, 2, block}), PushOutcome::stored);
    EXPECT_EQ(ring.push({SampleIndex{6}, 2, block}), PushOutcome::dropped_full);
    EXPECT_EQ(ring.push({SampleIndex{12}, 2, block}), PushOutcome::dropped_full);
    EXPECT_EQ(ring.dropped_frames(), 12U);
    EXPECT_EQ(ring.first_dropped(), SampleIndex{6});
}

TEST(SampleRing, TwoThreadsHandOverEveryFloatInOrder) {
    SampleRing ring(4096, 64);
    constexpr std::uint64_t frames = 60'000;
    std::thread producer([&] {
        std::vector<float> block;
        for (std::uint64_t at = 0; at < frames;) {
            const auto size = std::min<std::uint64_t>(1 + at % 97, frames - at);
            block.resize(size);
            std::iota(block.begin(), block.end(), static_cast<float>(at));
            while (ring.push({SampleIndex{at}, 1, block}) != PushOutcome::stored) {
                std::this_thread::yield();
            }
            at += size;
        }
    });
    std::uint64_t next = 0;
    bool in_order = true;
    std::vector<float> out;
    while (next < frames) {
        SampleIndex first{};
        if (!ring.pop(first, out)) {
            std::this_thread::yield();
            continue;
        }
        in_order = in_order && first.value == next;
        for (const auto value : out) {
            in_order = in_order && value == static_cast<float>(next++);
        }
    }
    producer.join();
    EXPECT_TRUE(in_order);
}

} // namespace
} // namespace millpond
