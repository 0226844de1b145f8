#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "outputs/pulse_line.hpp"
#include "outputs/silent_output.hpp"

#include <gtest/gtest.h>

#include <csignal>
#include <mutex>
#include <sys/wait.h>
#include <thread>
#include <unistd.h>
#include <vector>

namespace millpond {
namespace {

using namespace std::chrono_literals;

struct RecordedLine : Output {
    std::mutex mutex;
    std::vector<bool> orders;
    bool works = true;
    bool set_line(bool high) noexcept override {
        const std::scoped_lock lock(mutex);
        orders.push_back(high);
        return works;
    }
    std::vector<bool> all() {
        const std::scoped_lock lock(mutex);
        return orders;
    }
};

struct KeptEnds : EventSink {
    std::mutex mutex;
    std::vector<Event> events;
    void take(const Event& event) noexcept override {
        const std::scoped_lock lock(mutex);
        events.push_back(event);
    }
    std::size_t count() {
        const std::scoped_lock lock(mutex);
        return events.size();
    }
};

void wait_for(KeptEnds& ends, std::size_t count) {
    for (int i = 0; i < 5000 && ends.count() < count; ++i) {
        std::this_thread::sleep_for(1ms);
    }
    ASSERT_EQ(ends.count(), count);
}

TEST(PulseLine, IsLowBeforeTheFirstPulseAndAfterTheEnd) {
    RecordedLine line;
    KeptEnds ends;
    { PulseLine pulses(line, {1ms, 1, 10ms}, ends); }
    EXPECT_EQ(line.all(), (std::vector<bool>{false, false}));
}

TEST(PulseLine, RisesAtOnceAndFallsNoSoonerThanTheWidth) {
    RecordedLine line;
    KeptEnds ends;
    PulseLine pulses(line, {3ms, 1, 10ms}, ends);
    EXPECT_TRUE(pulses.rise(SampleIndex{77}));
    EXPECT_EQ(line.all(), (std::vector<bool>{false, true}));
    wait_for(ends, 1);
    EXPECT_EQ(line.all(), (std::vector<bool>{false, true, false}));
    const auto end = ends.events[0].as<PulseEndDetail>();
    EXPECT_GE(end.width_ns, 3'000'000);
    EXPECT_GE(end.late_ns, 0);
    EXPECT_EQ(ends.events[0].sample, SampleIndex{77});
}

TEST(PulseLine, TrainHasItsCountOfPulsesEachEnded) {
    RecordedLine line;
    KeptEnds ends;
    PulseLine pulses(line, {1ms, 4, 3ms}, ends);
    pulses.rise(SampleIndex{1});
    wait_for(ends, 4);
    EXPECT_EQ(line.all(), (std::vector<bool>{false, true, false, true, false, true, false, true, false}));
}

TEST(PulseLine, FallNowEndsALongPulseAndTheRestOfTheTrain) {
    RecordedLine line;
    KeptEnds ends;
    PulseLine pulses(line, {10s, 3, 20s}, ends);
    pulses.rise(SampleIndex{1});
    pulses.fall_now();
    EXPECT_FALSE(line.all().back());
    wait_for(ends, 1);
    EXPECT_FALSE(line.all().back());
    EXPECT_LT(ends.events[0].as<PulseEndDetail>().width_ns, 5'000'000'000);
}

TEST(PulseLine, EndsTheLineLowWhenItIsDestroyedInTheMiddleOfAPulse) {
    RecordedLine line;
    KeptEnds ends;
    {
        PulseLine pulses(line, {10s, 1, 20s}, ends);
        pulses.rise(SampleIndex{1});
    }
    EXPECT_FALSE(line.all().back());
}

TEST(PulseLine, SaysWhenAnOrderDidNotGetThrough) {
    RecordedLine line;
    line.works = false;
    KeptEnds ends;
    PulseLine pulses(line, {1ms, 1, 10ms}, ends);
    EXPECT_FALSE(pulses.rise(SampleIndex{1}));
    wait_for(ends, 1);
    EXPECT_TRUE(pulses.failed());
    pulses.mended();
    EXPECT_FALSE(pulses.failed());
}

TEST(PulseLine, RefusesTrainsWhosePulsesOverlap) {
    OutputSettings settings;
    settings.train_pulses = 2;
    settings.width_ms = 5.0;
    settings.train_period_ms = 5.0;
    EXPECT_THROW((void)pulse_shape(settings), Refusal);
}

/// Tells through a pipe what it was ordered, so that a parent can look after the death of its child.
struct PipedLine : Output {
    int descriptor;
    explicit PipedLine(int to) : descriptor(to) {}
    bool set_line(bool high) noexcept override { return write(descriptor, high ? "1" : "0", 1) == 1; }
};

TEST(PulseLine, CrashOfTheProgramLeavesTheLineLow) {
    for (const int signal : {SIGSEGV, SIGABRT, SIGFPE}) {
        int ends[2];
        ASSERT_EQ(pipe(ends), 0);
        const pid_t child = fork();
        if (child == 0) {
            PipedLine line(ends[1]);
            guard_line_against_crashes(&line);
            line.set_line(true);
            raise(signal);
            _exit(0);
        }
        close(ends[1]);
        int status = 0;
        waitpid(child, &status, 0);
        char orders[8] = {};
        EXPECT_EQ(read(ends[0], orders, sizeof orders), 2);
        close(ends[0]);
        EXPECT_STREQ(orders, "10");
        EXPECT_TRUE(WIFSIGNALED(status)) << "the crash itself must not be hidden";
        EXPECT_EQ(WTERMSIG(status), signal);
    }
}

} // namespace
} // namespace millpond
