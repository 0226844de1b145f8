// A serial port, opened raw. Thread: control, but where a function says otherwise.
#pragma once

#include "outputs/device_file.hpp"

#include <cstdint>

namespace millpond {

class SerialPort {
  public:
    /// Opens through Boost.Asio: raw, 8 bits, no parity, one stop bit, no flow control. Refuses what is not there, what
    /// this user may not open, what another session holds and what is no serial port. The kernel raises RTS and DTR
    /// whenever a port is opened.
    SerialPort(const std::string& path, const std::string& where, std::uint32_t baud,
               DeviceControl control = control_device);

    /// ioctl. Thread: any, and signal handlers.
    [[nodiscard]] bool order(unsigned long request, void* argument) const noexcept {
        return control_(file_.descriptor(), request, argument) == 0;
    }
    /// Opens it again, briefly, with the same settings. False where it is not there.
    bool reopen() noexcept;
    /// A port that is closed drops RTS and DTR, unless told to keep them.
    void keep_lines_at_close() noexcept;

    [[nodiscard]] const DeviceFile& file() const noexcept { return file_; }
    /// Thread: control.
    [[nodiscard]] bool exists() noexcept { return file_.exists(); }

  private:
    void set_lines_at_close() const noexcept;

    DeviceFile file_;
    std::uint32_t baud_;
    DeviceControl control_;
    bool keeps_lines_ = false;
};

} // namespace millpond
