#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "outputs/crash_guard.hpp"
#include "outputs/pulse_lines.hpp"
#include "support/allocation_guard.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <array>
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

/// One recorded line that follows pulses, played.
struct Played {
    explicit Played(PulseShape shape)
        : lines(std::vector<PulseLinePlan>{{&line, shape, Follows::pulse}}, board, ends) {}
    bool rise(std::uint64_t sample) { return lines.rise(Follows::pulse, SampleIndex{sample}); }
    RecordedLine line;
    KeptEnds ends;
    LineBoard board;
    PulseLines lines;
};

TEST(PulseLines, IsLowBeforeTheFirstPulseAndAfterTheEnd) {
    RecordedLine line;
    KeptEnds ends;
    LineBoard board;
    { const PulseLines lines(std::vector<PulseLinePlan>{{&line, {1ms, 1, 10ms}, Follows::pulse}}, board, ends); }
    const auto orders = line.all();
    EXPECT_GE(orders.size(), 2U);
    EXPECT_EQ(std::count(orders.begin(), orders.end(), true), 0);
}

TEST(PulseLines, RisesAtOnceAndFallsNoSoonerThanTheWidth) {
    Played played({3ms, 1, 10ms});
    EXPECT_TRUE(played.rise(77));
    EXPECT_EQ(played.line.all(), (std::vector<bool>{false, true}));
    wait_for(played.ends, 1);
    EXPECT_EQ(played.line.all(), (std::vector<bool>{false, true, false}));
    const auto end = played.ends.events[0].as<PulseEndDetail>();
    EXPECT_GE(end.width_ns, 3'000'000);
    EXPECT_GE(end.late_ns, 0);
    EXPECT_EQ(played.ends.events[0].sample, SampleIndex{77});
}

TEST(PulseLines, TrainHasItsCountOfPulsesEachEnded) {
    Played played({1ms, 4, 3ms});
    played.rise(1);
    wait_for(played.ends, 4);
    EXPECT_EQ(played.line.all(), (std::vector<bool>{false, true, false, true, false, true, false, true, false}));
}

TEST(PulseLines, FallNowEndsALongPulseAndTheRestOfTheTrain) {
    Played played({10s, 3, 20s});
    played.rise(1);
    played.lines.fall_now();
    EXPECT_FALSE(played.line.all().back());
    wait_for(played.ends, 1);
    EXPECT_FALSE(played.line.all().back());
    EXPECT_LT(played.ends.events[0].as<PulseEndDetail>().width_ns, 5'000'000'000);
}

TEST(PulseLines, EndsTheLineLowWhenItIsDestroyedInTheMiddleOfAPulse) {
    RecordedLine line;
    KeptEnds ends;
    LineBoard board;
    {
        PulseLines lines(std::vector<PulseLinePlan>{{&line, {10s, 1, 20s}, Follows::pulse}}, board, ends);
        lines.rise(Follows::pulse, SampleIndex{1});
    }
    EXPECT_FALSE(line.all().back());
    EXPECT_EQ(ends.count(), 1U) << "a pulse cut short has an end too";
}

TEST(PulseLines, SaysWhenAnOrderDidNotGetThrough) {
    Played played({1ms, 1, 10ms});
    played.line.works = false;
    EXPECT_FALSE(played.rise(1));
    wait_for(played.ends, 1);
    EXPECT_EQ(played.lines.trouble(), StateCause::output_failed);
    played.lines.mended();
    EXPECT_EQ(played.lines.trouble(), std::nullopt);
}

/// Two lines that follow pulses, each with a shape of its own, and one that follows triggers.
struct ThreeLines {
    RecordedLine brief, slow, marker;
    KeptEnds ends;
    LineBoard board;
    PulseLines lines{std::vector<PulseLinePlan>{{&brief, {1ms, 3, 4ms}, Follows::pulse},
                                                {&slow, {30ms, 1, 40ms}, Follows::pulse},
                                                {&marker, {2ms, 1, 10ms}, Follows::trigger}},
                     board, ends};
};

TEST(PulseLines, SeveralPlayTheirOwnShapesAtOnce) {
    ThreeLines rig;
    EXPECT_TRUE(rig.lines.rise(Follows::pulse, SampleIndex{5}));
    EXPECT_TRUE(rig.lines.rise(Follows::trigger, SampleIndex{5}));
    wait_for(rig.ends, 5);
    EXPECT_EQ(rig.brief.all(), (std::vector<bool>{false, true, false, true, false, true, false}));
    EXPECT_EQ(rig.slow.all(), (std::vector<bool>{false, true, false}));
    EXPECT_EQ(rig.marker.all(), (std::vector<bool>{false, true, false}));
    constexpr std::array<std::int64_t, 3> widths{1'000'000, 30'000'000, 2'000'000};
    std::array<int, 3> ends{};
    for (const auto& event : rig.ends.events) {
        const auto end = event.as<PulseEndDetail>();
        ++ends.at(end.output);
        EXPECT_EQ(end.marker, end.output == 2 ? 1 : 0);
        // Later pulses of a train may rise late and fall on time.
        EXPECT_GE(end.width_ns, end.output == 0 ? 0 : widths.at(end.output));
        EXPECT_GE(end.late_ns, 0);
    }
    EXPECT_EQ(ends, (std::array<int, 3>{3, 1, 1}));
}

TEST(PulseLines, AMarkerRisesWithoutAPulse) {
    ThreeLines rig;
    rig.lines.rise(Follows::trigger, SampleIndex{5});
    wait_for(rig.ends, 1);
    EXPECT_EQ(rig.marker.all(), (std::vector<bool>{false, true, false}));
    EXPECT_EQ(rig.brief.all(), (std::vector<bool>{false}));
    EXPECT_EQ(rig.slow.all(), (std::vector<bool>{false}));
}

// A pulse that is ordered while another line is high must not wait for that line's end.
TEST(PulseLines, AShortPulseOrderedDuringALongOneEndsFirst) {
    RecordedLine slow, brief;
    KeptEnds ends;
    LineBoard board;
    PulseLines lines(
        std::vector<PulseLinePlan>{{&slow, {10s, 1, 20s}, Follows::pulse}, {&brief, {1ms, 1, 10ms}, Follows::trigger}},
        board, ends);
    lines.rise(Follows::pulse, SampleIndex{1});
    std::this_thread::sleep_for(5ms); // the pulse thread sleeps by now
    lines.rise(Follows::trigger, SampleIndex{1});
    wait_for(ends, 1);
    EXPECT_FALSE(brief.all().back());
    EXPECT_TRUE(slow.all().back());
}

TEST(PulseLines, LostDeviceIsTroubleUntilItIsBackAndSomebodyArms) {
    Played played({1ms, 1, 10ms});
    played.lines.set_lost(0, true);
    EXPECT_EQ(played.lines.trouble(), StateCause::output_failed);
    played.lines.mended();
    EXPECT_EQ(played.lines.trouble(), StateCause::output_failed) << "arming does not bring it back";
    played.lines.set_lost(0, false);
    EXPECT_EQ(played.lines.trouble(), std::nullopt);
}

TEST(PulseLines, LostWatchdogIsTroubleUntilAnotherWatchesAndSomebodyArms) {
    Played played({1ms, 1, 10ms});
    played.lines.set_watched(false);
    played.lines.mended();
    EXPECT_EQ(played.lines.trouble(), StateCause::watchdog_lost);
    played.lines.set_watched(false);
    played.lines.set_watched(true);
    EXPECT_EQ(played.lines.trouble(), StateCause::watchdog_lost);
    played.lines.mended();
    EXPECT_EQ(played.lines.trouble(), std::nullopt);
}

// The allocation guard counts for this thread; the pulse thread runs the same noexcept code on fixed memory.
TEST(PulseLines, RiseAndFallAllocateNothing) {
    ThreeLines rig;
    rig.lines.rise(Follows::pulse, SampleIndex{1}); // what a first call may still set up
    rig.lines.fall_now();
    struct Quiet : Output {
        bool set_line(bool /*high*/) noexcept override { return true; }
    } quiet;
    PulseLines lines(std::vector<PulseLinePlan>{{&quiet, {1ms, 1, 10ms}, Follows::pulse}}, rig.board, rig.ends);
    const test::AllocationGuard guard;
    lines.rise(Follows::pulse, SampleIndex{1});
    (void)lines.trouble();
    lines.mended();
    lines.fall_now();
    EXPECT_EQ(guard.allocations(), 0U);
}

TEST(PulseLines, RefusesTrainsWhosePulsesOverlap) {
    OutputSettings settings;
    settings.train_pulses = 2;
    settings.width_ms = 5.0;
    settings.train_period_ms = 5.0;
    EXPECT_THROW((void)pulse_shape(settings), Refusal);
}

TEST(LongestHigh, IsSmallAgainstThePulseUnlessSaidAndNeverShorterThanIt) {
    OutputSettings settings;
    EXPECT_EQ(longest_high(settings), Nanos{20'000'000});
    settings.width_ms = 10.0;
    EXPECT_EQ(longest_high(settings), Nanos{50'000'000});
    settings.longest_high_ms = 12.5;
    EXPECT_EQ(longest_high(settings), Nanos{12'500'000});
    settings.longest_high_ms = 10.0;
    EXPECT_THROW((void)longest_high(settings), Refusal);
}

/// Tells through a pipe what it was ordered, so that a parent can look after the death of its child.
struct PipedLine : Output {
    int descriptor;
    explicit PipedLine(int to) : descriptor(to) {}
    bool set_line(bool high) noexcept override { return write(descriptor, high ? "1" : "0", 1) == 1; }
};

TEST(PulseLines, CrashOfTheProgramLeavesTheLineLow) {
    for (const int signal : {SIGSEGV, SIGABRT, SIGFPE}) {
        int ends[2];
        ASSERT_EQ(pipe(ends), 0);
        const pid_t child = fork();
        if (child == 0) {
            PipedLine line(ends[1]);
            Output* lines[] = {&line};
            guard_lines_against_crashes(lines);
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
