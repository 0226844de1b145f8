#include "intake/stream_order.hpp"

#include <gtest/gtest.h>

#include <optional>
#include <sstream>
#include <string>
#include <utility>
#include <vector>

namespace millpond {
namespace {

using std::chrono::milliseconds;

// 1 kHz and ten frames a packet: one packet every 10 ms.
class StreamOrderTest : public ::testing::Test {
  protected:
    void wait_at_most(Nanos wait, std::size_t buffers = 8) {
        order_.emplace(OrderSettings{Hertz{1000.0}, wait, milliseconds{1000}, buffers}, counts_);
    }

    StreamOrder& order() {
        if (!order_) {
            wait_at_most(Nanos{0}, 2);
        }
        return *order_;
    }

    /// Packet `number` of a source that began with `sequence_` and `timestamp_`, arriving at its time or at `arrived`.
    PacketPlace packet(int number, std::optional<Nanos> arrived = {}) const {
        PacketPlace place;
        place.ssrc = ssrc_;
        place.sequence = static_cast<std::uint16_t>(sequence_ + number);
        place.timestamp = timestamp_ + static_cast<std::uint32_t>(10 * number);
        place.frames = 10;
        place.arrived = arrived.value_or(begin_ + milliseconds{10 * number});
        return place;
    }

    bool offer(const PacketPlace& place) {
        now_ = std::max(now_, place.arrived);
        return order().offer(place, next_buffer_++) == StreamOrder::Offer::held;
    }

    /// What can be delivered now, as `first[+skip][/cause]` of each.
    std::string delivered() {
        std::ostringstream text;
        SampleIndex end = order().next_sample();
        const char* between = "";
        for (StreamOrder::Ready ready; order().pop(now_, ready); end = order().next_sample()) {
            text << std::exchange(between, " ") << ready.first.value;
            if (ready.skip_frames > 0) {
                text << "+skip" << ready.skip_frames;
            }
            if (ready.first > end) {
                text << (ready.gap_cause == GapCause::source_restart ? "/restart" : "/loss");
            }
        }
        return text.str();
    }

    std::string send(int number) {
        offer(packet(number));
        return delivered();
    }

    std::string send_all(const std::vector<int>& numbers) {
        std::string text;
        for (const int number : numbers) {
            text += text.empty() ? send(number) : ' ' + send(number);
        }
        return text;
    }

    std::uint64_t count(PacketCause cause) const { return counts_[static_cast<std::size_t>(cause)]; }

    PacketCounts counts_{};
    std::optional<StreamOrder> order_;
    std::uint32_t ssrc_ = 1;
    std::uint16_t sequence_ = 100;
    std::uint32_t timestamp_ = 5000;
    Nanos begin_{milliseconds{50000}};
    Nanos now_{0};
    std::uint32_t next_buffer_ = 0;
};

TEST_F(StreamOrderTest, TheFirstPacketsFirstFrameIsPlaceZero) {
    EXPECT_EQ(send(0), "0");
    EXPECT_EQ(send(1), "10");
    EXPECT_EQ(send(2), "20");
    EXPECT_EQ(count(PacketCause::accepted), 3U);
}

TEST_F(StreamOrderTest, LostPacketBecomesAGapOfItsFrames) {
    EXPECT_EQ(send_all({0, 3}), "0 30/loss");
    EXPECT_EQ(count(PacketCause::lost), 2U);
    EXPECT_EQ(count(PacketCause::accepted), 2U);
}

TEST_F(StreamOrderTest, ARepeatIsDroppedAndCounted) {
    send(0);
    send(1);
    EXPECT_EQ(send(1), "");
    EXPECT_EQ(send(0), "");
    EXPECT_EQ(count(PacketCause::repeated), 2U);
    EXPECT_EQ(count(PacketCause::late), 0U);
}

TEST_F(StreamOrderTest, WithoutAWaitAPacketOutOfOrderIsLate) {
    send(0);
    EXPECT_EQ(send(2), "20/loss");
    EXPECT_EQ(send(1), "");
    EXPECT_EQ(send(3), "30");
    EXPECT_EQ(count(PacketCause::late), 1U);
    EXPECT_EQ(count(PacketCause::repeated), 0U);
    EXPECT_EQ(count(PacketCause::reordered), 0U);
}

TEST_F(StreamOrderTest, WithinTheWaitAReorderIsPutRight) {
    wait_at_most(milliseconds{25});
    EXPECT_EQ(send(0), "0");
    EXPECT_EQ(send(2), "");
    EXPECT_EQ(send(3), "");
    offer(packet(1, begin_ + milliseconds{31}));
    EXPECT_EQ(delivered(), "10 20 30");
    EXPECT_EQ(count(PacketCause::reordered), 1U);
    EXPECT_EQ(count(PacketCause::lost), 0U);
}

TEST_F(StreamOrderTest, WhenTheWaitIsOverTheMissingPacketIsAGap) {
    wait_at_most(milliseconds{25});
    send(0);
    send(2);
    EXPECT_EQ(order().next_deadline(), begin_ + milliseconds{45});
    now_ = begin_ + milliseconds{44};
    EXPECT_EQ(delivered(), "");
    now_ = begin_ + milliseconds{45};
    EXPECT_EQ(delivered(), "20/loss");
    EXPECT_EQ(order().next_deadline(), Nanos::max());
    EXPECT_EQ(send(1), "");
    EXPECT_EQ(count(PacketCause::late), 1U);
    EXPECT_EQ(count(PacketCause::lost), 1U);
}

TEST_F(StreamOrderTest, ARepeatOfAPacketThatWaitsIsDropped) {
    wait_at_most(milliseconds{25});
    send(0);
    send(2);
    EXPECT_FALSE(offer(packet(2)));
    EXPECT_EQ(count(PacketCause::repeated), 1U);
}

TEST_F(StreamOrderTest, FullBuffersEndTheWait) {
    wait_at_most(milliseconds{1000}, 3);
    send(0);
    EXPECT_EQ(send(2), "");
    EXPECT_EQ(send(3), "");
    EXPECT_EQ(send(4), "20/loss 30 40");
}

TEST_F(StreamOrderTest, SequenceNumberAndTimeStampTurnOverUnnoticed) {
    sequence_ = 65534;
    timestamp_ = 0xFFFFFFFFU - 14;
    EXPECT_EQ(send_all({0, 1, 2, 3}), "0 10 20 30");
    EXPECT_EQ(send(6), "60/loss");
    EXPECT_EQ(send(4), "");
    EXPECT_EQ(count(PacketCause::lost), 2U);
    EXPECT_EQ(count(PacketCause::late), 1U);
}

TEST_F(StreamOrderTest, PlacesGoOnThroughManyTurnsOfTheSequenceNumber) {
    for (int number = 0; number < 200'000; ++number) {
        ASSERT_EQ(send(number), std::to_string(10 * number));
    }
    EXPECT_EQ(count(PacketCause::accepted), 200'000U);
    EXPECT_EQ(count(PacketCause::lost), 0U);
}

TEST_F(StreamOrderTest, TimeStampsAreTheTruthWhereTheyDisagreeWithTheSequence) {
    send(0);
    auto muted = packet(1);
    muted.timestamp += 7; // the sender left out seven frames, no packet is missing
    offer(muted);
    EXPECT_EQ(delivered(), "17/loss");
    EXPECT_EQ(count(PacketCause::lost), 0U);
}

TEST_F(StreamOrderTest, OfFramesThatOverlapTheNewOnesAreUsed) {
    send(0);
    auto overlapping = packet(1);
    overlapping.timestamp -= 4;
    offer(overlapping);
    EXPECT_EQ(delivered(), "10+skip4");
    EXPECT_EQ(order().next_sample(), SampleIndex{16});
}

TEST_F(StreamOrderTest, AHeldPacketWhollyCoveredByAnotherIsARepeatAndGivesItsBufferBack) {
    wait_at_most(milliseconds{25});
    send(0);
    auto inner = packet(2);
    inner.timestamp += 2;
    inner.frames = 5;
    EXPECT_TRUE(offer(inner)); // buffer 1
    EXPECT_TRUE(offer(packet(2)));
    EXPECT_TRUE(offer(packet(1)));
    EXPECT_EQ(delivered(), "10 20");
    EXPECT_EQ(count(PacketCause::repeated), 1U);
    std::uint32_t freed = 99;
    EXPECT_TRUE(order().take_freed(freed));
    EXPECT_EQ(freed, 1U);
    EXPECT_FALSE(order().take_freed(freed));
}

TEST_F(StreamOrderTest, AnotherSourceIsDroppedWhileTheKnownOneIsAlive) {
    send(0);
    auto foreign = packet(1);
    foreign.ssrc = 2;
    EXPECT_FALSE(offer(foreign));
    EXPECT_EQ(send(1), "10");
    EXPECT_EQ(count(PacketCause::wrong_source), 1U);
}

TEST_F(StreamOrderTest, ANewSourceAfterSilenceIsARestartWhoseGapTheClockTells) {
    send(0);
    ssrc_ = 2;
    sequence_ = 40000;
    timestamp_ = 777;
    begin_ += milliseconds{3000};
    EXPECT_EQ(send(0), "") << "one packet could be a stray";
    EXPECT_EQ(send(1), "3000/restart 3010") << "3000 ms after the one before";
    EXPECT_EQ(send(2), "3020");
    EXPECT_EQ(count(PacketCause::restarted), 1U);
    EXPECT_EQ(count(PacketCause::lost), 0U);
    EXPECT_EQ(count(PacketCause::wrong_source), 0U);
    EXPECT_EQ(count(PacketCause::accepted), 4U);
}

TEST_F(StreamOrderTest, ASourceThatCameBackAfterAStrayGoesOn) {
    send(0);
    auto stray = packet(0, begin_ + milliseconds{1500});
    stray.ssrc = 2;
    EXPECT_TRUE(offer(stray)); // buffer 1
    EXPECT_EQ(send(151), "1510/loss");
    EXPECT_EQ(count(PacketCause::wrong_source), 1U);
    EXPECT_EQ(count(PacketCause::restarted), 0U);
    std::uint32_t freed = 99;
    EXPECT_TRUE(order().take_freed(freed));
    EXPECT_EQ(freed, 1U);
}

TEST_F(StreamOrderTest, AnImplausibleJumpOfTheSameSourceIsARestart) {
    send(0);
    send(1);
    timestamp_ += 5'000'000; // 5000 s, while the clock went on by 10 ms
    EXPECT_EQ(send(2), "");
    EXPECT_EQ(send(3), "21/restart 31") << "no time passed, but one frame tells that the signal broke";
    timestamp_ -= 9'000'000;
    EXPECT_EQ(send_all({4, 5}), "42/restart 52");
    EXPECT_EQ(count(PacketCause::restarted), 2U);
}

TEST_F(StreamOrderTest, OnePacketWithAWildTimeStampIsAStray) {
    send(0);
    auto wild = packet(1);
    wild.timestamp ^= 0x40000000U;
    EXPECT_TRUE(offer(wild));
    EXPECT_EQ(delivered(), "");
    EXPECT_EQ(send(2), "20/loss");
    EXPECT_EQ(send(3), "30");
    EXPECT_EQ(count(PacketCause::wrong_source), 1U);
    EXPECT_EQ(count(PacketCause::restarted), 0U);
}

TEST_F(StreamOrderTest, ALongLossIsNoRestartWhereTheClockWentOnAsFar) {
    send(0);
    EXPECT_EQ(send(1000), "10000/loss");
    EXPECT_EQ(count(PacketCause::restarted), 0U);
    EXPECT_EQ(count(PacketCause::lost), 999U);
}

TEST_F(StreamOrderTest, PacketsThatWaitAreDeliveredBeforeARestart) {
    wait_at_most(milliseconds{900});
    send(0);
    EXPECT_EQ(send(2), "");
    ssrc_ = 2;
    begin_ += milliseconds{1100};
    timestamp_ = 0;
    EXPECT_EQ(send(0), "20/loss") << "its wait is over";
    now_ = Nanos{0};
    EXPECT_EQ(send(1), "1100/restart 1110") << "20 ms + 1080 ms of silence";
}

TEST_F(StreamOrderTest, ARestartReleasesWhatStillWaits) {
    wait_at_most(milliseconds{1000});
    send(0);
    EXPECT_EQ(send(2), "");
    timestamp_ += 5'000'000;
    EXPECT_EQ(send(3), "");
    EXPECT_EQ(send(4), "20/loss 31/restart 41");
}

} // namespace
} // namespace millpond
