#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "intake/rtp_sender.hpp"
#include "intake/rtp_source.hpp"
#include "packets.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <csignal>
#include <pthread.h>
#include <thread>

namespace millpond {
namespace {

using namespace test;
using std::chrono::milliseconds;
using std::chrono::seconds;

struct Pair {
    StreamSettings receiver = two_channels();
    RtpSenderSettings sender;

    explicit Pair(SampleEncoding encoding, std::uint8_t send_time_id) {
        receiver.encoding = encoding;
        receiver.microvolts_per_count = 0.195;
        receiver.send_time_extension = send_time_id;
        sender.stream = {"127.0.0.1", receiver.port, 96, encoding, 1250, 2, send_time_id};
        sender.microvolts_per_count = 0.195F;
        sender.frames_per_packet = 5;
    }
};

std::vector<float> quantised(std::size_t frames, float scale) {
    std::vector<float> microvolts;
    for (std::size_t i = 0; i < 2 * frames; ++i) {
        microvolts.push_back(static_cast<float>(std::lround(20000.0 * std::sin(0.01 * static_cast<double>(i)))) *
                             scale);
    }
    return microvolts;
}

TEST(RtpSender, WhatItSendsTheSourceReceivesBitForBit) {
    for (const auto encoding : {SampleEncoding::l16, SampleEncoding::l24}) {
        Pair pair(encoding, 3);
        RtpSource source(pair.receiver);
        RtpSender sender(pair.sender);
        const auto sent = quantised(500, 0.195F);
        std::vector<float> received;
        Arrival arrival;
        for (std::size_t frame = 0; frame < 500; frame += 5) {
            const auto before = realtime_now().count();
            sender.send(std::span(sent).subspan(2 * frame, 10));
            ASSERT_EQ(source.receive(seconds{5}, arrival), Received::frames);
            EXPECT_EQ(arrival.block.first, SampleIndex{frame});
            EXPECT_GE(arrival.sent_ns, before);
            EXPECT_LE(arrival.sent_ns, arrival.arrived_ns);
            received.insert(received.end(), arrival.block.data.begin(), arrival.block.data.end());
        }
        EXPECT_EQ(received, sent);
        EXPECT_EQ(sender.counts().packets, 100U);
        EXPECT_EQ(sender.counts().frames, 500U);
        EXPECT_EQ(sender.counts().losses.clipped, 0U);
    }
}

TEST(RtpSender, WithoutSendTimeThePacketsCarryNone) {
    Pair pair(SampleEncoding::l16, 0);
    pair.receiver.send_time_extension = 3;
    RtpSource source(pair.receiver);
    RtpSender sender(pair.sender);
    sender.send(quantised(5, 0.195F));
    Arrival arrival;
    ASSERT_EQ(source.receive(seconds{5}, arrival), Received::frames);
    EXPECT_EQ(arrival.sent_ns, 0);
}

TEST(RtpSender, PacketsLeftOutAreGapsAtTheSource) {
    Pair pair(SampleEncoding::l16, 0);
    pair.sender.lose_every = 3;
    RtpSource source(pair.receiver);
    RtpSender sender(pair.sender);
    std::vector<std::uint64_t> places;
    Arrival arrival;
    for (int i = 0; i < 7; ++i) {
        sender.send(quantised(5, 0.195F));
        if (source.receive(Nanos{0}, arrival) == Received::frames) {
            places.push_back(arrival.block.first.value);
        }
    }
    EXPECT_EQ(places, (std::vector<std::uint64_t>{0, 5, 15, 20, 30}));
    EXPECT_EQ(sender.counts().left_out, 2U);
    EXPECT_EQ(source.counts()[static_cast<std::size_t>(PacketCause::lost)], 2U);
}

TEST(RtpSender, ClippingIsCounted) {
    Pair pair(SampleEncoding::l16, 0);
    RtpSender sender(pair.sender);
    sender.send(std::vector<float>{1e6F, 0.0F});
    EXPECT_EQ(sender.counts().losses.clipped, 1U);
}

TEST(RtpSender, PacketsThatUdpCannotCarryAreRefused) {
    Pair pair(SampleEncoding::l16, 0);
    pair.sender.frames_per_packet = (65507 - 12) / 4;
    EXPECT_NO_THROW(RtpSender{pair.sender});
    ++pair.sender.frames_per_packet;
    EXPECT_THROW(RtpSender{pair.sender}, Refusal);
    pair.sender.frames_per_packet = 0;
    EXPECT_THROW(RtpSender{pair.sender}, Refusal);
}

TEST(Pace, NoFrameIsDueBeforeItsTime) {
    const auto begin = monotonic_now();
    Pace pace(Hertz{1000.0}, 2.0);
    EXPECT_TRUE(pace.wait_for(40));
    EXPECT_GE(monotonic_now() - begin, milliseconds{20});
    EXPECT_TRUE(pace.wait_for(10)) << "long due: returns at once";
    EXPECT_GE(pace.most_late(), milliseconds{15});
}

TEST(Pace, ASignalEndsTheWait) {
    struct sigaction action {};
    action.sa_handler = [](int) {};
    sigaction(SIGUSR1, &action, nullptr);
    const auto waiting = pthread_self();
    std::thread other([waiting] {
        std::this_thread::sleep_for(milliseconds{30});
        pthread_kill(waiting, SIGUSR1);
    });
    Pace pace(Hertz{1000.0}, 1.0);
    EXPECT_FALSE(pace.wait_for(60'000));
    other.join();
}

} // namespace
} // namespace millpond
