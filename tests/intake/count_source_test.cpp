#include "base/refusal.hpp"
#include "intake/count_source.hpp"
#include "intake/daq_source.hpp"
#include "support/files.hpp"

#include <gtest/gtest.h>

#include <fcntl.h>
#include <unistd.h>

namespace millpond {
namespace {

using namespace std::chrono_literals;

/// A board's file: what is written at the one end is read at the other.
struct Counts {
    int ends[2];
    Counts() { EXPECT_EQ(::pipe2(ends, O_NONBLOCK | O_CLOEXEC), 0); }
    ~Counts() {
        ::close(ends[0]);
        close_end();
    }
    void close_end() {
        ::close(ends[1]);
        ends[1] = -1;
    }
    template <class Count> void write(const std::vector<Count>& counts) const {
        EXPECT_EQ(::write(ends[1], counts.data(), counts.size() * sizeof(Count)),
                  static_cast<ssize_t>(counts.size() * sizeof(Count)));
    }
};

// Worked by hand: a 12-bit board of -5 to 5 V, seen through an amplifier of 1000: 2.441406 uV a count, 4096 for 10 mV.
CountFormat twelve_bits(std::size_t channels) {
    return {Hertz{1250.0}, std::vector<CountScale>(channels, CountScale{-5000.0F, 10000.0F / 4096.0F}), 2};
}

TEST(CountSource, GivesMicrovoltsOfEachChannelsOwnScale) {
    const Counts board;
    auto format = twelve_bits(2);
    format.channels[1] = {100.0F, 2.0F};
    CountSource source(format, board.ends[0]);
    board.write<std::uint16_t>({0, 0, 2048, 10, 4095, 65535});
    Arrival arrival;
    ASSERT_EQ(source.receive(1s, arrival), Received::frames);
    EXPECT_EQ(arrival.block.frames(), 3U);
    EXPECT_EQ(
        std::vector<float>(arrival.block.data.begin(), arrival.block.data.end()),
        (std::vector<float>{-5000.0F, 100.0F, 0.0F, 120.0F, -5000.0F + 4095.0F * (10000.0F / 4096.0F), 131170.0F}));
}

TEST(CountSource, ReadsFourByteCounts) {
    const Counts board;
    CountSource source({Hertz{1000.0}, {{-1.0F, 0x1p-24F}}, 4}, board.ends[0]);
    board.write<std::uint32_t>({0, 0x0100'0000, 0x0200'0000});
    Arrival arrival;
    ASSERT_EQ(source.receive(1s, arrival), Received::frames);
    EXPECT_EQ(std::vector<float>(arrival.block.data.begin(), arrival.block.data.end()),
              (std::vector<float>{-1.0F, 0.0F, 1.0F}));
}

TEST(CountSource, AFrameInPiecesIsWhole) {
    const Counts board;
    CountSource source(twelve_bits(2), board.ends[0]);
    Arrival arrival;
    board.write<std::uint16_t>({1, 2, 3});
    ASSERT_EQ(source.receive(1s, arrival), Received::frames);
    EXPECT_EQ(arrival.block.frames(), 1U);
    EXPECT_EQ(source.receive(0s, arrival), Received::nothing);
    board.write<std::uint16_t>({4});
    ASSERT_EQ(source.receive(1s, arrival), Received::frames);
    EXPECT_EQ(arrival.block.first, SampleIndex{1});
    EXPECT_EQ(arrival.block.frames(), 1U);
}

TEST(CountSource, TheEndOfTheBoardsFileIsTheEndOfTheStream) {
    Counts board;
    CountSource source(twelve_bits(1), board.ends[0]);
    board.close_end();
    Arrival arrival;
    EXPECT_EQ(source.receive(1s, arrival), Received::ended);
}

TEST(DaqSource, WhatIsNoBoardIsRefusedInOneLine) {
    const test::TemporaryFolder folder;
    StreamSettings settings;
    settings.source = SourceKind::daq;
    settings.device = folder.file("plain", "no board").string();
    settings.rate_hz = 1000.0;
    settings.channels = 1;
    EXPECT_THROW((void)open_daq_source(settings), Refusal);
}

} // namespace
} // namespace millpond
