#include "outputs/line_keeper.hpp"
#include "outputs/watchdog.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

#include <csignal>
#include <sys/wait.h>

namespace millpond {
namespace {

using namespace std::chrono_literals;

/// Writes what it is ordered to a pipe, whichever process orders it.
class PipedLine : public Output {
  public:
    PipedLine() {
        if (::pipe2(ends_, O_CLOEXEC | O_NONBLOCK) != 0) {
            throw std::runtime_error("no pipe");
        }
    }
    ~PipedLine() override {
        ::close(ends_[0]);
        ::close(ends_[1]);
    }
    PipedLine(const PipedLine&) = delete;
    PipedLine& operator=(const PipedLine&) = delete;

    bool set_line(bool high) noexcept override { return ::write(ends_[1], high ? "1" : "0", 1) == 1; }
    bool answers() noexcept override { return there; }
    bool reopen() noexcept override { return there; }

    std::string all() {
        char byte = 0;
        while (::read(ends_[0], &byte, 1) == 1) {
            seen_ += byte;
        }
        return seen_;
    }
    bool becomes(char level) {
        return test::wait_until([&] { return !all().empty() && all().back() == level; });
    }

    bool there = true;

  private:
    int ends_[2];
    std::string seen_;
};

std::vector<WatchedLine> watched(PipedLine& line, Nanos longest) {
    return {{&line, longest}};
}

TEST(Watchdog, LowersALineThatIsHighForTooLongAndSaysSo) {
    PipedLine line;
    LineBoard board;
    Watchdog watchdog(watched(line, 20ms), board);
    board.rises(0);
    const auto rose = monotonic_now();
    line.set_line(true);
    ASSERT_TRUE(line.becomes('0'));
    EXPECT_GE(monotonic_now() - rose, 20ms);
    EXPECT_TRUE(test::wait_until([&] { return board.held() == 1; }));
    std::this_thread::sleep_for(60ms);
    EXPECT_EQ(line.all(), "10") << "once is enough";
    EXPECT_EQ(board.held(), 1U);
}

TEST(Watchdog, LeavesALineAloneThatFallsInTime) {
    PipedLine line;
    LineBoard board;
    Watchdog watchdog(watched(line, 10s), board);
    board.rises(0);
    line.set_line(true);
    line.set_line(false);
    board.fell(0);
    std::this_thread::sleep_for(50ms);
    EXPECT_EQ(line.all(), "10");
    EXPECT_EQ(board.held(), 0U);
    EXPECT_TRUE(watchdog.watches());
}

TEST(Watchdog, GoesHomeWithoutTouchingTheLine) {
    PipedLine line;
    LineBoard board;
    { const Watchdog watchdog(watched(line, 10s), board); }
    EXPECT_EQ(line.all(), "");
}

/// A program with a watchdog and its line high; killed by `signal`, which goes to its process group where `group`.
std::string last_level_after(int signal, bool group) {
    PipedLine line;
    int ready[2];
    EXPECT_EQ(::pipe(ready), 0);
    const pid_t program = ::fork();
    if (program == 0) {
        ::setpgid(0, 0);
        LineBoard board;
        const Watchdog watchdog(watched(line, 60s), board);
        while (board.beats() == 0) {
            ::usleep(1000);
        }
        board.rises(0);
        line.set_line(true);
        (void)!::write(ready[1], "r", 1);
        for (;;) {
            ::pause();
        }
    }
    char word = 0;
    EXPECT_EQ(::read(ready[0], &word, 1), 1);
    ::close(ready[0]);
    ::close(ready[1]);
    EXPECT_EQ(line.all(), "1");
    ::kill(group ? -program : program, signal);
    ::waitpid(program, nullptr, 0);
    EXPECT_TRUE(line.becomes('0'));
    return line.all();
}

TEST(Watchdog, LowersTheLineOfAProgramThatWasKilled) {
    EXPECT_EQ(last_level_after(SIGKILL, false).substr(0, 2), "10");
}

TEST(Watchdog, OutlivesSignalsToTheProcessGroup) {
    for (const int signal : {SIGINT, SIGTERM, SIGHUP, SIGQUIT, SIGKILL}) {
        EXPECT_EQ(last_level_after(signal, true).substr(0, 2), "10") << signal;
    }
}

TEST(Watchdog, TakesNoSignalThatCanBeIgnored) {
    PipedLine line;
    LineBoard board;
    Watchdog watchdog(watched(line, 10s), board);
    ASSERT_TRUE(test::wait_until([&] { return board.beats() > 0; }));
    for (const int signal : {SIGINT, SIGTERM, SIGHUP, SIGQUIT, SIGTSTP}) {
        ::kill(watchdog.process(), signal);
    }
    const auto before = board.beats();
    EXPECT_TRUE(test::wait_until([&] { return board.beats() > before + 3; }));
    EXPECT_TRUE(watchdog.watches());
}

TEST(Watchdog, IsMissedWhenItDiesAndWhenItStandsStill) {
    PipedLine line;
    LineBoard board;
    {
        Watchdog watchdog(watched(line, 10s), board);
        ::kill(watchdog.process(), SIGKILL);
        EXPECT_TRUE(test::wait_until([&] { return !watchdog.watches(); }));
    }
    Watchdog watchdog(watched(line, 10s), board);
    ::kill(watchdog.process(), SIGSTOP);
    EXPECT_TRUE(test::wait_until([&] { return !watchdog.watches(); }));
}

struct NoEnds : EventSink {
    void take(const Event& /*event*/) noexcept override {}
};

/// A keeper over one line, looked with until something is told.
struct Kept {
    PipedLine line;
    LineBoard board;
    LineKeeper keeper{watched(line, 10s), board, {}};
    NoEnds ends;
    PulseLines pulses{std::vector<PulseLinePlan>{{&line, {1ms, 1, 10ms}, Follows::pulse}}, board, ends};
    std::string told;

    bool tells(const std::string& what) {
        const LineKeeper::Tell tell{
            [this](std::size_t, DeviceState state) { told += std::string(name_of(state)) + ";"; },
            [this](bool watches) { told += watches ? "watched;" : "unwatched;"; }};
        return test::wait_until([&] {
            keeper.look(pulses, tell);
            return told.ends_with(what + ";");
        });
    }
};

TEST(LineKeeper, TellsOfALostDeviceAndTriesItAgainUntilItIsBackLow) {
    Kept kept;
    kept.line.there = false;
    ASSERT_TRUE(kept.tells("lost"));
    EXPECT_EQ(kept.pulses.trouble(), StateCause::output_failed);
    kept.line.there = true;
    const auto process = kept.keeper.watchdog_process();
    ASSERT_TRUE(kept.tells("back"));
    EXPECT_EQ(kept.told, "lost;back;");
    EXPECT_EQ(kept.line.all().back(), '0');
    EXPECT_NE(kept.keeper.watchdog_process(), process) << "the old watchdog holds the lost device";
    kept.pulses.mended();
    EXPECT_EQ(kept.pulses.trouble(), std::nullopt);
}

TEST(LineKeeper, ReplacesAWatchdogThatDied) {
    Kept kept;
    const auto first = kept.keeper.watchdog_process();
    ::kill(first, SIGKILL);
    ASSERT_TRUE(kept.tells("watched"));
    EXPECT_EQ(kept.told, "unwatched;watched;");
    EXPECT_NE(kept.keeper.watchdog_process(), first);
    EXPECT_EQ(kept.pulses.trouble(), StateCause::watchdog_lost) << "until somebody arms again";
    kept.pulses.mended();
    EXPECT_EQ(kept.pulses.trouble(), std::nullopt);
}

} // namespace
} // namespace millpond
