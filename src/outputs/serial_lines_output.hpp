// A modem line of a serial port as a TTL line: RTS or DTR. Two outputs may share one port.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"
#include "outputs/serial_port.hpp"

#include <memory>

namespace millpond {

class SerialLinesOutput : public Output {
  public:
    /// Refuses a port without modem lines. Thread: control.
    SerialLinesOutput(const OutputSettings& settings, std::shared_ptr<SerialPort> port);

    bool set_line(bool high) noexcept override;
    bool answers() noexcept override;
    bool reopen() noexcept override;

  private:
    std::shared_ptr<SerialPort> port_;
    int bit_;
    bool inverted_;
};

} // namespace millpond
