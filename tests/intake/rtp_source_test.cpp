#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "intake/ntp_time.hpp"
#include "intake/rtp_source.hpp"
#include "packets.hpp"
#include "support/allocation_guard.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using namespace test;
using std::chrono::milliseconds;
using std::chrono::seconds;

std::uint64_t count(const RtpSource& source, PacketCause cause) {
    return source.counts()[static_cast<std::size_t>(cause)];
}

std::vector<float> samples_of(const Arrival& arrival) {
    return {arrival.block.data.begin(), arrival.block.data.end()};
}

class RtpSourceTest : public ::testing::Test {
  protected:
    StreamSettings settings_ = two_channels();
    UdpSender sender_{settings_.port};
    Arrival arrival_;
};

TEST_F(RtpSourceTest, DeliversFramesInMicrovoltsFromPlaceZeroOn) {
    RtpSource source(settings_);
    sender_.send(l16_packet({500, 9000}, {1, -2, 3, -4}));
    sender_.send(l16_packet({501, 9002}, {5, -6}));
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.block.first, SampleIndex{0});
    EXPECT_EQ(arrival_.block.channels, 2U);
    EXPECT_EQ(samples_of(arrival_), (std::vector<float>{0.5F, -1.0F, 1.5F, -2.0F}));
    EXPECT_FALSE(arrival_.counts_changed);
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.block.first, SampleIndex{2});
    EXPECT_EQ(samples_of(arrival_), (std::vector<float>{2.5F, -3.0F}));
    EXPECT_EQ(count(source, PacketCause::accepted), 2U);
}

TEST_F(RtpSourceTest, WithoutPacketsTheTimeRunsOut) {
    RtpSource source(settings_);
    EXPECT_EQ(source.receive(Nanos{0}, arrival_), Received::nothing);
    EXPECT_EQ(source.receive(milliseconds{3}, arrival_), Received::nothing);
    const auto begin = monotonic_now();
    EXPECT_EQ(source.receive(milliseconds{35}, arrival_), Received::nothing); // long enough for the blocking read
    EXPECT_GE(monotonic_now() - begin, milliseconds{35});
}

TEST_F(RtpSourceTest, ASpinningCallerFindsWhatIsThere) {
    RtpSource source(settings_);
    sender_.send(l16_packet({}, {1, 2})); // loopback: in the socket's queue when send returns
    EXPECT_EQ(source.receive(Nanos{0}, arrival_), Received::frames);
}

TEST_F(RtpSourceTest, KernelStampLiesBetweenSendingAndReceiving) {
    RtpSource source(settings_);
    const auto before = realtime_now().count();
    sender_.send(l16_packet({}, {1, 2}));
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_GE(arrival_.arrived_ns, before);
    EXPECT_LE(arrival_.arrived_ns, realtime_now().count());
    EXPECT_EQ(arrival_.sent_ns, 0) << "the packet carries none";
}

TEST_F(RtpSourceTest, SendTimeComesOutOfTheHeaderExtension) {
    settings_.send_time_extension = 4;
    RtpSource source(settings_);
    const std::int64_t sent = 1'796'118'000'123'456'789;
    sender_.send(l16_packet({0, 0, 7, 96, ntp_from_unix_ns(sent), 4}, {1, 2}));
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.sent_ns, sent);
    EXPECT_EQ(samples_of(arrival_), (std::vector<float>{0.5F, 1.0F}));
}

TEST_F(RtpSourceTest, BadPacketsAreCountedByCauseAndWaitedPast) {
    settings_.max_packet_bytes = 64;
    RtpSource source(settings_);
    auto wrong_version = l16_packet({}, {1, 2});
    wrong_version[0] = 0x00;
    auto truncated = l16_packet({}, {});
    truncated.pop_back();
    sender_.send(l16_packet({1, 0}, {1, 2}));
    sender_.send(wrong_version);
    sender_.send(truncated);
    sender_.send({});
    sender_.send(l16_packet({1, 0, 7, 97}, {1, 2}));
    sender_.send(l16_packet({1, 0, 8}, {1, 2}));
    sender_.send(l16_packet({1, 0}, {1, 2, 3}));
    sender_.send(l16_packet({1, 0}, {}));
    sender_.send(l16_packet({1, 0}, std::vector<std::int16_t>(28)));
    sender_.send(l16_packet({1, 0}, {1, 2}));
    sender_.send(l16_packet({3, 2}, {5, 6}));
    sender_.send(l16_packet({2, 1}, {3, 4}));
    sender_.send(l16_packet({4, 3}, {7, 8}));
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_FALSE(arrival_.counts_changed);
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_TRUE(arrival_.counts_changed);
    EXPECT_EQ(arrival_.block.first, SampleIndex{2});
    EXPECT_EQ(arrival_.gap_cause, GapCause::packet_loss);
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(source.counts(), (PacketCounts{3, 2, 1, 1, 1, 2, 1, 1, 1, 0, 1, 0}));
}

TEST_F(RtpSourceTest, OnlyBadPacketsEndWithNothingButTell) {
    RtpSource source(settings_);
    sender_.send({1, 2, 3});
    EXPECT_EQ(source.receive(milliseconds{5}, arrival_), Received::nothing);
    EXPECT_TRUE(arrival_.counts_changed);
    EXPECT_EQ(source.receive(milliseconds{1}, arrival_), Received::nothing);
    EXPECT_FALSE(arrival_.counts_changed);
}

TEST_F(RtpSourceTest, APacketOfExactlyTheGreatestSizeIsTaken) {
    settings_.max_packet_bytes = 64;
    RtpSource source(settings_);
    sender_.send(l16_packet({}, std::vector<std::int16_t>(26))); // 12 + 52 bytes
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(count(source, PacketCause::oversized), 0U);
}

TEST_F(RtpSourceTest, AReorderWithinTheWaitIsPutRightAndAMissingPacketEndsTheWait) {
    settings_.reorder_wait_ms = 60.0;
    RtpSource source(settings_);
    sender_.send(l16_packet({0, 0}, {1, 2}));
    sender_.send(l16_packet({2, 2}, {5, 6}));
    sender_.send(l16_packet({1, 1}, {3, 4}));
    for (std::uint64_t place = 0; place < 3; ++place) {
        ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
        EXPECT_EQ(arrival_.block.first, SampleIndex{place});
        EXPECT_EQ(samples_of(arrival_)[0], static_cast<float>(2 * place + 1) * 0.5F);
    }
    EXPECT_EQ(count(source, PacketCause::reordered), 1U);
    sender_.send(l16_packet({4, 4}, {9, 10}));
    EXPECT_EQ(source.receive(Nanos{0}, arrival_), Received::nothing) << "the packet before it may still come";
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.block.first, SampleIndex{4});
    EXPECT_EQ(count(source, PacketCause::lost), 1U);
}

TEST_F(RtpSourceTest, ReceivingAllocatesNothing) {
    settings_.reorder_wait_ms = 1.0;
    settings_.restart_after_ms = 10.0;
    RtpSource source(settings_);
    std::uint64_t blocks = 0;
    std::uint64_t allocations = 0;
    for (std::uint16_t i = 0; i < 400; ++i) {
        // In disorder, with repeats, losses, bad packets, strays and a restart.
        const std::uint32_t began = i < 200 ? 0 : 100'000;
        const auto swapped = static_cast<std::uint16_t>(i ^ 1U);
        sender_.send(i % 50 == 0 ? Bytes{1, 2, 3} : l16_packet({swapped, began + swapped}, {1, 2}));
        sender_.send(l16_packet({i, i % 30 == 0 ? 7'000'000 : began + i}, {1, 2}));
        const test::AllocationGuard guard;
        while (source.receive(i % 20 == 0 ? milliseconds{25} : Nanos{0}, arrival_) == Received::frames) {
            ++blocks;
        }
        allocations += guard.allocations();
    }
    EXPECT_EQ(allocations, 0U);
    EXPECT_GT(blocks, 300U);
    EXPECT_GT(count(source, PacketCause::reordered), 0U);
    EXPECT_GT(count(source, PacketCause::restarted), 0U);
}

TEST_F(RtpSourceTest, APortInUseIsRefused) {
    RtpSource source(settings_);
    try {
        RtpSource second(settings_);
        FAIL() << "taken twice";
    } catch (const Refusal& refusal) {
        EXPECT_NE(std::string(refusal.what()).find("127.0.0.1:" + std::to_string(settings_.port)), std::string::npos);
    }
}

TEST_F(RtpSourceTest, PacketsThatTheKernelDroppedAreKnown) {
    settings_.receive_buffer_bytes = 4096;
    RtpSource source(settings_);
    EXPECT_GE(source.receive_buffer_bytes(), 1000U);
    for (std::uint16_t i = 0; i < 300; ++i) {
        sender_.send(l16_packet({i, i}, {1, 2}));
    }
    std::uint64_t received = 0;
    while (source.receive(milliseconds{1}, arrival_) == Received::frames) {
        ++received;
    }
    sender_.send(l16_packet({300, 300}, {1, 2})); // tells of the drops before it
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_LT(received, 300U);
    EXPECT_EQ(source.kernel_drops() + received, 300U);
    EXPECT_EQ(count(source, PacketCause::lost), 300U - received);
}

} // namespace
} // namespace millpond
