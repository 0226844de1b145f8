// A microcontroller that runs tools/pulse_line/pulse_line.ino as it stands, on an open end of a serial cable. Include
// in one file of a test program. Thread: test; the program runs in one of its own.
#pragma once

#include <atomic>
#include <chrono>
#include <mutex>
#include <poll.h>
#include <string>
#include <thread>
#include <unistd.h>

namespace millpond::test::board {

// What the program knows as its board's functions.
inline constexpr int HIGH = 1, LOW = 0, OUTPUT = 1;
inline std::mutex mutex;
inline std::string levels; ///< what the pin was told, in order

inline unsigned long millis() {
    const auto now = std::chrono::steady_clock::now().time_since_epoch();
    return static_cast<unsigned long>(std::chrono::duration_cast<std::chrono::milliseconds>(now).count());
}
inline void pinMode(int /*pin*/, int /*mode*/) {}
inline void digitalWrite(int /*pin*/, int level) {
    const std::scoped_lock lock(mutex);
    levels += level == HIGH ? '1' : '0';
}

struct SerialOfBoard {
    int cable = -1;
    unsigned char byte = 0;
    void begin(long /*baud*/) {}
    int available() {
        pollfd waits{cable, POLLIN, 0};
        const bool there = ::poll(&waits, 1, 1) > 0 && ::read(cable, &byte, 1) == 1;
        if (!there && (waits.revents & POLLHUP) != 0) {
            ::usleep(1000); // nobody has the other end open
        }
        return there ? 1 : 0;
    }
    [[nodiscard]] int read() const { return byte; }
    void write(char one) const { print(std::string(1, one)); }
    void print(const std::string& text) const { (void)!::write(cable, text.data(), text.size()); }
    void println(unsigned long number) const { print(std::to_string(number) + "\r\n"); }
};
inline SerialOfBoard Serial;

#include "../../tools/pulse_line/pulse_line.ino"

} // namespace millpond::test::board

namespace millpond::test {

/// Powered from its making to its end.
class Board {
  public:
    explicit Board(int cable) {
        board::Serial.cable = cable;
        board::levels.clear();
        thread_ = std::thread([this] {
            board::setup();
            while (!stopping_) {
                board::loop();
            }
        });
    }
    ~Board() {
        stopping_ = true;
        thread_.join();
    }
    Board(const Board&) = delete;
    Board& operator=(const Board&) = delete;

    [[nodiscard]] static std::string levels() {
        const std::scoped_lock lock(board::mutex);
        return board::levels;
    }

  private:
    std::atomic<bool> stopping_{false};
    std::thread thread_;
};

} // namespace millpond::test
