// Kinds of output, each against what stands in for its device: a function in the driver's place for ioctls, a
// pseudo-terminal for a cable, the microcontroller's own program at its end.
#include "base/refusal.hpp"
#include "outputs/library_line_output.hpp"
#include "outputs/make_output.hpp"
#include "outputs/parallel_port_output.hpp"
#include "outputs/serial_bytes_output.hpp"
#include "outputs/serial_lines_output.hpp"
#include "support/board.hpp"
#include "support/files.hpp"
#include "support/process.hpp"
#include "support/pseudo_terminal.hpp"

#include <gtest/gtest.h>

#include <atomic>
#include <linux/ppdev.h>
#include <sys/ioctl.h>

namespace millpond {
namespace {

using namespace std::chrono_literals;

std::string refusal_of(const OutputSettings& settings) {
    try {
        (void)make_outputs({settings});
    } catch (const Refusal& refused) {
        return refused.what();
    }
    return {};
}

OutputSettings of_kind(OutputKind kind, std::string device) {
    OutputSettings settings;
    settings.name = "left";
    settings.kind = kind;
    settings.device = std::move(device);
    return settings;
}

TEST(MakeOutputs, RefusesADeviceThatIsNotThereOrOfAnotherKindInOneLineThatNamesOutputAndKey) {
    const test::TemporaryFolder folder;
    const auto plain = folder.file("plain", "no device").string();
    for (const auto kind : {OutputKind::serial_lines, OutputKind::serial_bytes, OutputKind::parallel_port,
                            OutputKind::daq_line, OutputKind::gpio_line}) {
        for (const auto& device : {(folder / "none").string(), plain}) {
            const auto line = refusal_of(of_kind(kind, device));
            EXPECT_NE(line.find("outputs.left."), std::string::npos) << line;
            EXPECT_NE(line.find("; allowed: "), std::string::npos) << line;
            EXPECT_EQ(line.find('\n'), std::string::npos) << line;
        }
    }
}

TEST(MakeOutputs, RefusesAPseudoTerminalAsModemLinesSinceItHasNone) {
    const test::TemporaryFolder folder;
    const test::PseudoTerminal cable(folder / "line");
    const auto line = refusal_of(of_kind(OutputKind::serial_lines, cable.name()));
    EXPECT_NE(line.find("modem lines"), std::string::npos) << line;
}

// --- a driver's place

struct Driver {
    static inline int modem = 0;
    static inline std::atomic<std::uint8_t> data = 0; // as a port, it may be written by two at once
    static inline bool claimed = false, there = true;

    static void reset() {
        modem = TIOCM_RTS | TIOCM_DTR; // as an opened port comes
        data = 0xFF;
        claimed = false;
        there = true;
    }

    static int control(int /*descriptor*/, unsigned long request, void* argument) noexcept {
        if (!there) {
            errno = EIO;
            return -1;
        }
        switch (request) {
        case TIOCMBIS:
            modem |= *static_cast<int*>(argument);
            return 0;
        case TIOCMBIC:
            modem &= ~*static_cast<int*>(argument);
            return 0;
        case TIOCMGET:
            *static_cast<int*>(argument) = modem;
            return 0;
        case PPCLAIM:
            claimed = true;
            return 0;
        case PPWDATA:
            if (claimed) {
                data = *static_cast<std::uint8_t*>(argument);
            }
            return claimed ? 0 : -1;
        default:
            return 0;
        }
    }
};

struct ModemLines : testing::Test {
    test::TemporaryFolder folder;
    test::PseudoTerminal cable{folder / "line"}; // opens as a serial port does; the driver's place has the lines
    std::shared_ptr<SerialPort> port() {
        Driver::reset();
        return std::make_shared<SerialPort>(cable.name(), "outputs.left.device", 115200U, Driver::control);
    }
};

TEST_F(ModemLines, EachOutputMovesItsOwnLineAndBothStartLow) {
    auto settings = of_kind(OutputKind::serial_lines, cable.name());
    const auto shared = port();
    SerialLinesOutput rts(settings, shared);
    EXPECT_EQ(Driver::modem, TIOCM_DTR);
    settings.modem_line = ModemLine::dtr;
    SerialLinesOutput dtr(settings, shared);
    EXPECT_EQ(Driver::modem, 0);
    EXPECT_TRUE(rts.set_line(true));
    EXPECT_EQ(Driver::modem, TIOCM_RTS);
    EXPECT_TRUE(dtr.set_line(true));
    EXPECT_TRUE(rts.set_line(false));
    EXPECT_EQ(Driver::modem, TIOCM_DTR);
}

TEST_F(ModemLines, InvertedIsLowWhereTheLineIsSetAndStaysSoWhenThePortIsClosed) {
    auto settings = of_kind(OutputKind::serial_lines, cable.name());
    settings.inverted = true;
    const auto shared = port();
    SerialLinesOutput output(settings, shared);
    EXPECT_NE(Driver::modem & TIOCM_RTS, 0);
    output.set_line(true);
    EXPECT_EQ(Driver::modem & TIOCM_RTS, 0);
    termios now{};
    ASSERT_EQ(::tcgetattr(shared->file().descriptor(), &now), 0);
    EXPECT_EQ(now.c_cflag & HUPCL, 0U) << "a port that drops its lines would raise this one";
}

TEST_F(ModemLines, AnswersUntilTheCableIsGone) {
    SerialLinesOutput output(of_kind(OutputKind::serial_lines, cable.name()), port());
    EXPECT_TRUE(output.answers());
    Driver::there = false;
    EXPECT_FALSE(output.answers());
    EXPECT_FALSE(output.set_line(true));
    EXPECT_FALSE(output.reopen());
    Driver::there = true;
    cable.unplug();
    EXPECT_FALSE(output.answers());
    cable.plug_in();
    EXPECT_TRUE(output.reopen());
}

TEST_F(ModemLines, AreForOneSessionAlone) {
    const auto first = port();
    EXPECT_THROW(port(), Refusal);
}

struct ParallelPortTest : testing::Test {
    test::TemporaryFolder folder;
    std::string file = folder.file("parport", "").string();
    std::shared_ptr<ParallelPort> port() {
        Driver::reset();
        return std::make_shared<ParallelPort>(file, "outputs.left.device", Driver::control);
    }
    OutputSettings bits(std::uint16_t mask, bool inverted = false) {
        auto settings = of_kind(OutputKind::parallel_port, file);
        settings.data_bits = mask;
        settings.inverted = inverted;
        return settings;
    }
};

TEST_F(ParallelPortTest, OutputsOfOnePortMoveTheirOwnBitsOnly) {
    const auto shared = port();
    ParallelPortOutput one(bits(1), shared), two(bits(2 | 128), shared);
    EXPECT_EQ(Driver::data, 0);
    EXPECT_TRUE(one.set_line(true));
    EXPECT_EQ(Driver::data, 1);
    EXPECT_TRUE(two.set_line(true));
    EXPECT_EQ(Driver::data, 1 | 2 | 128);
    EXPECT_TRUE(one.set_line(false));
    EXPECT_EQ(Driver::data, 2 | 128);
}

TEST_F(ParallelPortTest, InvertedBitsAreSetWhileTheLineIsLow) {
    const auto shared = port();
    ParallelPortOutput line(bits(4, true), shared), other(bits(1), shared);
    EXPECT_EQ(Driver::data, 4);
    line.set_line(true);
    EXPECT_EQ(Driver::data, 0);
}

// From two threads at once no order is lost, and no line shows a level that nobody ordered.
TEST_F(ParallelPortTest, TwoThreadsEachKeepTheirOwnLine) {
    const auto shared = port();
    ParallelPortOutput one(bits(1), shared), two(bits(2), shared);
    const auto toggle = [](Output& output) {
        for (int i = 0; i < 5000; ++i) {
            output.set_line(i % 2 == 0);
        }
    };
    std::thread other([&] { toggle(two); });
    toggle(one);
    other.join();
    EXPECT_EQ(Driver::data, 0) << "both were ordered low last";
    one.set_line(true);
    EXPECT_EQ(Driver::data, 1);
}

// --- a library's place

struct Library {
    static inline int opened = 0, closed = 0;
    static inline bool there = true, level = true;
    static void reset() {
        opened = closed = 0;
        there = level = true;
    }
    static void* open(const OutputSettings& settings, bool low) {
        if (!there) {
            throw Refusal(settings.where("device"), "nothing", "a board");
        }
        level = low;
        return new int(++opened);
    }
    static bool write(void* line, bool to) noexcept {
        if (!there || *static_cast<int*>(line) != opened) {
            return false;
        }
        level = to;
        return true;
    }
    static bool answers(void* line) noexcept { return there && *static_cast<int*>(line) == opened; }
    static void close(void* line) noexcept {
        ++closed;
        delete static_cast<int*>(line);
    }
    static constexpr LineLibrary table() { return {open, write, answers, close}; }
};

TEST(LibraryLine, OpensLowAndFollowsOrdersByItsPolarity) {
    for (const bool inverted : {false, true}) {
        Library::reset();
        auto settings = of_kind(OutputKind::daq_line, "/dev/comedi0");
        settings.inverted = inverted;
        LibraryLineOutput output(settings, Library::table());
        EXPECT_EQ(Library::level, inverted);
        EXPECT_TRUE(output.set_line(true));
        EXPECT_EQ(Library::level, !inverted);
        EXPECT_TRUE(output.set_line(false));
        EXPECT_EQ(Library::level, inverted);
    }
}

TEST(LibraryLine, ALostBoardIsOpenedAgainAndEveryOneIsClosedInTheEnd) {
    Library::reset();
    {
        LibraryLineOutput output(of_kind(OutputKind::gpio_line, "/dev/gpiochip0"), Library::table());
        Library::there = false;
        EXPECT_FALSE(output.answers());
        EXPECT_FALSE(output.set_line(true));
        EXPECT_FALSE(output.reopen());
        Library::there = true;
        EXPECT_TRUE(output.reopen());
        EXPECT_TRUE(output.answers());
        EXPECT_TRUE(output.set_line(true));
        EXPECT_TRUE(Library::level);
    }
    EXPECT_EQ(Library::opened, 2);
    EXPECT_EQ(Library::closed, 2);
}

// --- a microcontroller

struct Microcontroller : testing::Test {
    test::TemporaryFolder folder;
    test::PseudoTerminal cable{folder / "board"};
    OutputSettings settings = of_kind(OutputKind::serial_bytes, (folder / "board").string());
};

TEST_F(Microcontroller, SaysWhoItIsAndFollowsOrders) {
    const test::Board board(cable.end());
    SerialBytesOutput output(settings);
    EXPECT_EQ(output.longest_high_ms(), 100U);
    const auto before = test::Board::levels();
    EXPECT_EQ(before.find('1'), std::string::npos);
    EXPECT_TRUE(output.set_line(true));
    EXPECT_TRUE(output.set_line(false));
    EXPECT_TRUE(test::wait_until([&] { return test::Board::levels().ends_with("10"); })) << test::Board::levels();
}

TEST_F(Microcontroller, LetsTheLineFallByItselfWhateverComes) {
    const test::Board board(cable.end());
    SerialBytesOutput output(settings);
    output.set_line(true);
    ASSERT_TRUE(test::wait_until([&] { return test::Board::levels().ends_with("1"); }));
    for (int i = 0; i < 5; ++i) {
        output.set_line(true); // must not make it longer
    }
    EXPECT_TRUE(test::wait_until([&] { return test::Board::levels().ends_with("10"); })) << test::Board::levels();
}

TEST_F(Microcontroller, AnswersAsLongAsItIsThere) {
    auto board = std::make_unique<test::Board>(cable.end());
    SerialBytesOutput output(settings);
    const auto end = monotonic_now() + 1500ms;
    while (monotonic_now() < end) {
        ASSERT_TRUE(output.answers());
        std::this_thread::sleep_for(20ms);
    }
    board.reset(); // it hangs; the cable is still in
    EXPECT_TRUE(test::wait_until([&] { return !output.answers(); }));
}

TEST_F(Microcontroller, APulledCableIsNoticedAndABoardThatIsBackIsOrderedLow) {
    auto board = std::make_unique<test::Board>(cable.end());
    SerialBytesOutput output(settings);
    board.reset();
    cable.unplug();
    EXPECT_FALSE(output.answers());
    EXPECT_FALSE(output.set_line(true));
    EXPECT_FALSE(output.reopen());
    cable.plug_in();
    board = std::make_unique<test::Board>(cable.end());
    EXPECT_TRUE(test::wait_until([&] { return output.reopen(); }));
    EXPECT_TRUE(output.answers());
    output.set_line(true);
    EXPECT_TRUE(test::wait_until([&] { return test::Board::levels().find('1') != std::string::npos; }));
}

TEST_F(Microcontroller, NobodyAtTheEndOfTheCableIsRefused) {
    EXPECT_NE(refusal_of(settings).find("nobody answers"), std::string::npos);
}

TEST_F(Microcontroller, ABoardThatWouldCutThePulseShortIsRefused) {
    const test::Board board(cable.end());
    settings.width_ms = 150.0;
    EXPECT_NE(refusal_of(settings).find("outputs.left.width_ms"), std::string::npos);
}

} // namespace
} // namespace millpond
