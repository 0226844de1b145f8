// A microcontroller on a serial port, one byte an order. Made for any: what it must do is
//
//   byte from here   what the microcontroller does
//   H                line high; it lets the line fall by itself after its own longest high time, whatever comes
//   L                line low
//   K                answers k; a second without any byte, and the line falls
//   ?                answers one line of text: "millpond line 1 N", N its longest high time in whole ms, ended by LF
//
// 8 data bits, no parity, one stop bit. All other bytes are ignored. tools/pulse_line/pulse_line.ino is such a program.
#pragma once

#include "base/clock.hpp"
#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"
#include "outputs/serial_port.hpp"

#include <cstdint>
#include <string>

namespace millpond {

class SerialBytesOutput : public Output {
  public:
    /// Orders low and asks who is there. Refuses where nobody answers `?` in time: a board may restart when its port is
    /// opened, which takes up to 3 s; and where the board would let the line fall before width_ms. Thread: control.
    explicit SerialBytesOutput(const OutputSettings& settings);

    bool set_line(bool high) noexcept override { return send(high ? 'H' : 'L'); }
    /// Sends K four times a second, and wants a k within a second.
    bool answers() noexcept override;
    bool reopen() noexcept override;

    /// By the board's own word.
    [[nodiscard]] std::uint32_t longest_high_ms() const noexcept { return longest_high_ms_; }

  private:
    bool send(char byte) const noexcept;
    bool identify(Nanos patience) noexcept;
    std::size_t take_bytes(char* to, std::size_t room) const noexcept;
    bool is_identity(const char* text, std::size_t length) noexcept;

    SerialPort port_;
    std::uint32_t longest_high_ms_ = 0;
    Nanos asked_at_{}, answered_at_{}, reopened_at_{};
};

} // namespace millpond
