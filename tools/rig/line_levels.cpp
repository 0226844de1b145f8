// Watches the lines of an emulated computer at the chips themselves, past every driver: line_levels
// Prints a line at each change: the time since the start in ms, then each line's level. Ports of a PC, read through
// /dev/port: data registers of the parallel ports at 0x378 and 0x278, modem control of the serial port at 0x2F8.
//
//     line_levels                         until it is killed
//     line_levels --attach DEVICE         gives the port at 0x278 to comedi's parallel-port driver, as DEVICE
//     line_levels --board TTY             is a microcontroller: tools/pulse_line/pulse_line.ino on a serial port
#include "support/board.hpp"

#include <array>
#include <chrono>
#include <comedi.h>
#include <cstdio>
#include <cstring>
#include <fcntl.h>
#include <string>
#include <sys/ioctl.h>
#include <termios.h>
#include <unistd.h>

namespace {

constexpr off_t parallel_data = 0x378, daq_data = 0x278, modem_control = 0x2F8 + 4;

int byte_at(int ports, off_t where) {
    unsigned char byte = 0;
    return ::pread(ports, &byte, 1, where) == 1 ? byte : -1;
}

using Levels = std::array<int, 5>;

// D0 and D1; RTS and DTR by their bits in the 16550's modem control register; D0 of the board.
Levels levels_now(int ports) {
    const int data = byte_at(ports, parallel_data), modem = byte_at(ports, modem_control);
    return {data & 1, data >> 1 & 1, modem >> 1 & 1, modem & 1, byte_at(ports, daq_data) & 1};
}

int watch() {
    const int ports = ::open("/dev/port", O_RDONLY | O_CLOEXEC);
    if (ports < 0) {
        std::perror("line_levels: /dev/port");
        return 1;
    }
    const auto began = std::chrono::steady_clock::now();
    Levels before{-1, -1, -1, -1, -1};
    std::puts("ms d0 d1 rts dtr daq");
    for (;; ::usleep(500)) {
        if (const auto now = levels_now(ports); now != before) {
            before = now;
            const auto ms = std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - began).count();
            std::printf("%.1f %d %d %d %d %d\n", ms, now[0], now[1], now[2], now[3], now[4]);
            std::fflush(stdout);
        }
    }
}

int attach(const char* device) {
    const int board = ::open(device, O_RDWR | O_CLOEXEC);
    comedi_devconfig config{};
    std::strncpy(config.board_name, "comedi_parport", sizeof config.board_name - 1);
    config.options[0] = static_cast<int>(daq_data);
    if (board < 0 || ::ioctl(board, COMEDI_DEVCONFIG, &config) != 0) {
        std::perror("line_levels: attach");
        return 1;
    }
    return 0;
}

int be_board(const char* tty) {
    const int cable = ::open(tty, O_RDWR | O_NOCTTY | O_NONBLOCK | O_CLOEXEC);
    termios raw{};
    if (cable < 0 || ::tcgetattr(cable, &raw) != 0) {
        std::perror("line_levels: board");
        return 1;
    }
    ::cfmakeraw(&raw);
    ::cfsetspeed(&raw, B115200);
    raw.c_cflag |= CLOCAL;
    ::tcsetattr(cable, TCSANOW, &raw);
    const millpond::test::Board board(cable);
    for (std::size_t told = 0;; ::usleep(500)) {
        for (const auto levels = millpond::test::Board::levels(); told < levels.size(); ++told) {
            std::printf("%c\n", levels[told]);
            std::fflush(stdout);
        }
    }
}

} // namespace

int main(int argc, char** argv) {
    const std::string what = argc > 2 ? argv[1] : "";
    return what == "--attach" ? attach(argv[2]) : what == "--board" ? be_board(argv[2]) : watch();
}
