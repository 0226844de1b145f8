// Data bits of a parallel port as TTL lines, through ppdev. Several outputs may share one port.
#pragma once

#include "outputs/device_file.hpp"
#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <atomic>
#include <cstdint>
#include <memory>

namespace millpond {

/// One port with its eight data bits. Thread: as Output.
class ParallelPort {
  public:
    /// Claims the port. Refuses one that is not there, may not be opened or is no parallel port. Thread: control.
    ParallelPort(const std::string& path, const std::string& where, DeviceControl control = control_device);
    ~ParallelPort();
    ParallelPort(const ParallelPort&) = delete;
    ParallelPort& operator=(const ParallelPort&) = delete;

    /// Sets the bits of `mask` to those of `bits`, and leaves the others as they are.
    bool set(std::uint8_t mask, std::uint8_t bits) noexcept;
    bool answers() noexcept;
    bool reopen() noexcept;

  private:
    bool claim() noexcept;
    bool write_data() noexcept;

    /// Shared with a watchdog process.
    struct Shared {
        std::atomic<std::uint8_t> data;
        std::atomic<std::uint32_t> writing;
    };
    DeviceFile file_;
    DeviceControl control_;
    Shared* shared_;
};

class ParallelPortOutput : public Output {
  public:
    ParallelPortOutput(const OutputSettings& settings, std::shared_ptr<ParallelPort> port);

    bool set_line(bool high) noexcept override {
        return port_->set(mask_, high != inverted_ ? mask_ : std::uint8_t{0});
    }
    bool answers() noexcept override { return port_->answers(); }
    bool reopen() noexcept override { return port_->reopen() && set_line(false); }

  private:
    std::shared_ptr<ParallelPort> port_;
    std::uint8_t mask_;
    bool inverted_;
};

} // namespace millpond
