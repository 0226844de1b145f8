#include "outputs/serial_lines_output.hpp"

#include <sys/ioctl.h>

namespace millpond {

SerialLinesOutput::SerialLinesOutput(const OutputSettings& settings, std::shared_ptr<SerialPort> port)
    : port_(std::move(port)), bit_(settings.modem_line == ModemLine::rts ? TIOCM_RTS : TIOCM_DTR),
      inverted_(settings.inverted) {
    if (!set_line(false) || !answers()) {
        refuse_device(port_->file(), "a serial port with modem lines, such as /dev/ttyS0");
    }
    if (inverted_) {
        port_->keep_lines_at_close(); // a dropped line is this output's high
    }
}

bool SerialLinesOutput::set_line(bool high) noexcept {
    int bit = bit_;
    return port_->order(high != inverted_ ? TIOCMBIS : TIOCMBIC, &bit);
}

bool SerialLinesOutput::answers() noexcept {
    int bits = 0;
    return port_->order(TIOCMGET, &bits) && port_->exists();
}

bool SerialLinesOutput::reopen() noexcept {
    return (answers() || port_->reopen()) && set_line(false);
}

} // namespace millpond
