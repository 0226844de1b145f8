#include "outputs/serial_port.hpp"

#include "base/refusal.hpp"

#include <boost/asio/io_context.hpp>
#include <boost/asio/serial_port.hpp>

#include <cerrno>
#include <fcntl.h>
#include <termios.h>

namespace millpond {
namespace {

namespace asio = boost::asio;

bool set_options(asio::serial_port& port, std::uint32_t baud) {
    boost::system::error_code trouble;
    const auto set = [&](auto option) {
        if (!trouble) {
            port.set_option(option, trouble);
        }
    };
    set(asio::serial_port::baud_rate(baud));
    set(asio::serial_port::character_size(8));
    set(asio::serial_port::parity(asio::serial_port::parity::none));
    set(asio::serial_port::stop_bits(asio::serial_port::stop_bits::one));
    set(asio::serial_port::flow_control(asio::serial_port::flow_control::none));
    return !trouble;
}

int copy_of(int descriptor) {
    return ::fcntl(descriptor, F_DUPFD_CLOEXEC, 0);
}

} // namespace

SerialPort::SerialPort(const std::string& path, const std::string& where, std::uint32_t baud, DeviceControl control)
    : file_(path, where), baud_(baud), control_(control) {
    asio::io_context context;
    asio::serial_port port(context);
    boost::system::error_code trouble;
    port.open(path, trouble);
    if (trouble.value() == ENOTTY || trouble.value() == EINVAL) {
        throw Refusal(where, path + " (no serial port)", "a serial port, such as /dev/ttyS0");
    }
    if (path.empty() || trouble) {
        errno = trouble.value();
        refuse_open(where, path);
    }
    if (!set_options(port, baud)) {
        throw Refusal(where, path + " at " + std::to_string(baud) + " baud", "a serial port that takes this rate");
    }
    // Asio's event loop is of no use here: lines are ordered by plain system calls, from threads and signal handlers.
    file_.adopt(copy_of(port.native_handle()));
    set_lines_at_close();
}

bool SerialPort::reopen() noexcept {
    termios raw{};
    if (!file_.reopen() || ::tcgetattr(file_.descriptor(), &raw) != 0) {
        return false;
    }
    ::cfmakeraw(&raw);
    raw.c_cflag |= CLOCAL | CREAD;
    if (::tcsetattr(file_.descriptor(), TCSANOW, &raw) != 0) {
        return false;
    }
    try {
        asio::io_context context;
        asio::serial_port port(context);
        port.assign(copy_of(file_.descriptor()));
        const bool set = set_options(port, baud_);
        set_lines_at_close();
        return set;
    } catch (const std::exception&) {
        return false; // no room for one more descriptor
    }
}

void SerialPort::keep_lines_at_close() noexcept {
    keeps_lines_ = true;
    set_lines_at_close();
}

void SerialPort::set_lines_at_close() const noexcept {
    termios now{};
    if (::tcgetattr(file_.descriptor(), &now) == 0) {
        now.c_cflag = keeps_lines_ ? now.c_cflag & ~static_cast<tcflag_t>(HUPCL) : now.c_cflag | HUPCL;
        ::tcsetattr(file_.descriptor(), TCSANOW, &now);
    }
}

} // namespace millpond
