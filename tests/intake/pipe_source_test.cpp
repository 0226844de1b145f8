#include "intake/pipe_source.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cstring>
#include <thread>
#include <unistd.h>

namespace millpond {
namespace {

using std::chrono::milliseconds;
using std::chrono::seconds;

class PipeSourceTest : public ::testing::Test {
  protected:
    void SetUp() override {
        ASSERT_EQ(pipe(ends_.data()), 0);
        settings_.source = SourceKind::pipe;
        settings_.encoding = SampleEncoding::int16;
        settings_.rate_hz = 1250.0;
        settings_.channels = 2;
        settings_.microvolts_per_count = 0.5;
        settings_ = resolved(settings_, "test.yaml");
    }
    void TearDown() override {
        close(ends_[0]);
        close_input();
    }

    void write(const std::vector<std::uint8_t>& bytes) {
        ASSERT_EQ(::write(ends_[1], bytes.data(), bytes.size()), static_cast<ssize_t>(bytes.size()));
    }
    void close_input() {
        if (ends_[1] >= 0) {
            close(ends_[1]);
            ends_[1] = -1;
        }
    }
    std::vector<float> samples() const { return {arrival_.block.data.begin(), arrival_.block.data.end()}; }

    std::array<int, 2> ends_{};
    StreamSettings settings_;
    Arrival arrival_;
};

TEST_F(PipeSourceTest, DeliversWhatIsThereInMicrovolts) {
    PipeSource source(settings_, ends_[0]);
    write({1, 0, 0xFE, 0xFF, 3, 0, 4, 0});
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.block.first, SampleIndex{0});
    EXPECT_EQ(arrival_.block.frames(), 2U);
    EXPECT_EQ(samples(), (std::vector<float>{0.5F, -1.0F, 1.5F, 2.0F}));
    EXPECT_EQ(arrival_.arrived_ns, 0) << "a pipe has no receive stamp";
    EXPECT_EQ(arrival_.sent_ns, 0);
    EXPECT_EQ(source.receive(Nanos{0}, arrival_), Received::nothing);
}

TEST_F(PipeSourceTest, APartOfAFrameIsKeptForTheNextRead) {
    PipeSource source(settings_, ends_[0]);
    write({1, 0, 2, 0, 3});
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(samples(), (std::vector<float>{0.5F, 1.0F}));
    write({0, 4});
    EXPECT_EQ(source.receive(milliseconds{1}, arrival_), Received::nothing);
    write({0});
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(arrival_.block.first, SampleIndex{1});
    EXPECT_EQ(samples(), (std::vector<float>{1.5F, 2.0F}));
}

TEST_F(PipeSourceTest, FloatsAreTakenAsMicrovolts) {
    settings_.encoding = SampleEncoding::float32;
    settings_.microvolts_per_count = 1.0;
    PipeSource source(settings_, ends_[0]);
    const std::array<float, 2> frame{-123.25F, 7.5F};
    std::vector<std::uint8_t> bytes(sizeof frame);
    std::memcpy(bytes.data(), frame.data(), sizeof frame);
    write(bytes);
    ASSERT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(samples(), (std::vector<float>{-123.25F, 7.5F}));
}

TEST_F(PipeSourceTest, TheEndComesAfterTheLastFrame) {
    PipeSource source(settings_, ends_[0]);
    write({1, 0, 2, 0});
    close_input();
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::ended);
    EXPECT_FALSE(arrival_.counts_changed);
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::ended);
    EXPECT_EQ(source.counts(), (PacketCounts{1}));
}

TEST_F(PipeSourceTest, AnEndInsideAFrameIsCountedAsTruncated) {
    PipeSource source(settings_, ends_[0]);
    write({1, 0, 2, 0, 3, 0});
    close_input();
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::frames);
    EXPECT_EQ(source.receive(seconds{5}, arrival_), Received::ended);
    EXPECT_TRUE(arrival_.counts_changed);
    EXPECT_EQ(source.counts(), (PacketCounts{1, 1}));
}

TEST_F(PipeSourceTest, InputPouredInFasterThanEightTimesRealPaceIsHeldBack) {
    PipeSource source(settings_, ends_[0]);
    write(std::vector<std::uint8_t>(40'000)); // 8 s of two channels
    std::size_t frames = 0;
    while (source.receive(Nanos{0}, arrival_) == Received::frames) {
        frames += arrival_.block.frames();
    }
    EXPECT_LT(frames, 10'000U) << "all at once";
    close_input();
    for (auto received = Received::nothing; received != Received::ended;) {
        received = source.receive(seconds{5}, arrival_);
        frames += received == Received::frames ? arrival_.block.frames() : 0;
    }
    EXPECT_EQ(frames, 10'000U) << "nothing is lost by it";
}

TEST_F(PipeSourceTest, MoreThanOneReadHoldsComesInSeveralBlocks) {
    settings_.rate_hz = 50000.0; // the input is a second long
    PipeSource source(settings_, ends_[0]);
    std::vector<std::uint8_t> bytes;
    for (int i = 0; i < 100'000; ++i) {
        bytes.push_back(static_cast<std::uint8_t>(i & 0xff));
        bytes.push_back(static_cast<std::uint8_t>((i >> 8) & 0x7f));
    }
    std::thread writer([&] {
        for (std::size_t at = 0; at < bytes.size();) {
            const auto wrote = ::write(ends_[1], bytes.data() + at, std::min<std::size_t>(bytes.size() - at, 7777));
            at += static_cast<std::size_t>(wrote);
        }
        close_input();
    });
    std::vector<float> all;
    Received received{};
    while ((received = source.receive(seconds{5}, arrival_)) == Received::frames) {
        EXPECT_EQ(arrival_.block.first, SampleIndex{all.size() / 2});
        all.insert(all.end(), arrival_.block.data.begin(), arrival_.block.data.end());
    }
    writer.join();
    EXPECT_EQ(received, Received::ended);
    ASSERT_EQ(all.size(), 100'000U);
    for (std::size_t i = 0; i < all.size(); ++i) {
        ASSERT_EQ(all[i], static_cast<float>(i & 0x7fffU) * 0.5F);
    }
}

TEST_F(PipeSourceTest, ABrokenDescriptorFails) {
    PipeSource source(settings_, ends_[1]); // the end to write to
    close(ends_[0]);
    ends_[0] = dup(ends_[1]);
    EXPECT_EQ(source.receive(milliseconds{5}, arrival_), Received::failed);
}

} // namespace
} // namespace millpond
