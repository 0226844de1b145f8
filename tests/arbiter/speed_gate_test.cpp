#include "arbiter/speed_gate.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using namespace std::chrono_literals;

/// Closes above 5, opens below 4 for 300 ms, stale after 200 ms. Starts at 1 s.
struct Gate : ::testing::Test {
    SpeedGate gate{{true, SpeedUnit::cm_per_s, 5.0, 4.0, 300.0, 200.0, 0.0}};
    Nanos now = 1s;

    /// Tells `speed` every 40 ms, as a camera of 25 Hz does, for `length`; true where the gate is open at the end.
    bool told(double speed, Nanos length) {
        for (const Nanos end = now + length; now < end; now += 40ms) {
            gate.take(speed, now);
        }
        return gate.open_at(now);
    }
};

TEST_F(Gate, IsClosedBeforeTheFirstSpeed) {
    EXPECT_FALSE(gate.open_at(now));
    EXPECT_FALSE(gate.any());
}

TEST_F(Gate, OpensOnceTheSpeedWasLowForTheWholeHold) {
    EXPECT_FALSE(told(1.0, 280ms));
    EXPECT_TRUE(told(1.0, 40ms));
}

TEST_F(Gate, ClosesAtTheFirstSpeedAboveItsLimit) {
    ASSERT_TRUE(told(1.0, 1s));
    gate.take(5.0, now);
    EXPECT_TRUE(gate.open_at(now)) << "not above";
    gate.take(5.1, now);
    EXPECT_FALSE(gate.open_at(now));
}

TEST_F(Gate, BetweenTheTwoSpeedsItStaysAsItIs) {
    ASSERT_TRUE(told(1.0, 1s));
    EXPECT_TRUE(told(4.5, 2s));
    EXPECT_FALSE(told(9.0, 100ms));
    EXPECT_FALSE(told(4.5, 2s));
    EXPECT_TRUE(told(3.9, 400ms));
}

TEST_F(Gate, OneHighSpeedBeginsTheHoldAnew) {
    EXPECT_FALSE(told(1.0, 200ms));
    EXPECT_FALSE(told(4.2, 40ms));
    EXPECT_FALSE(told(1.0, 200ms));
    EXPECT_TRUE(told(1.0, 120ms));
}

TEST_F(Gate, AStaleSpeedClosesItAndTheHoldBeginsAnew) {
    ASSERT_TRUE(told(1.0, 1s));
    const Nanos last = now - 40ms;
    EXPECT_TRUE(gate.open_at(last + 199ms));
    EXPECT_FALSE(gate.open_at(last + 200ms));
    now = last + 300ms;
    EXPECT_FALSE(told(1.0, 280ms));
    EXPECT_TRUE(told(1.0, 40ms));
}

TEST_F(Gate, AHoleInTheSpeedsThatNobodyLookedAtCountsAllTheSame) {
    ASSERT_TRUE(told(1.0, 1s));
    now += 5s; // no packet came either
    gate.take(1.0, now);
    EXPECT_FALSE(gate.open_at(now));
}

} // namespace
} // namespace millpond
