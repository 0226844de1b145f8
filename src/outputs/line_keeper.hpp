// Looks after the devices and the watchdog of a session: tells what was lost and what is back, tries lost devices again
// every second, and replaces a watchdog that died. Thread: control.
#pragma once

#include "outputs/pulse_lines.hpp"
#include "outputs/watchdog.hpp"

#include <functional>
#include <memory>
#include <vector>

namespace millpond {

class LineKeeper {
  public:
    struct Tell {
        std::function<void(std::size_t line, DeviceState state)> device;
        std::function<void(bool watched)> watchdog; ///< false: lost; true: another has taken over
    };

    /// Starts the watchdog; make it before other threads run. Lines and board outlive it.
    LineKeeper(std::vector<WatchedLine> lines, LineBoard& board, WatchdogSettings settings);

    /// Call every few tens of ms. Each look at a device is brief; `pulses` gets what is found.
    void look(PulseLines& pulses, const Tell& tell);

    [[nodiscard]] pid_t watchdog_process() const noexcept { return watchdog_ ? watchdog_->process() : -1; }

  private:
    void look_at(std::size_t line, PulseLines& pulses, const Tell& tell);
    void look_at_watchdog(PulseLines& pulses, const Tell& tell);
    bool replace_watchdog() noexcept;

    struct Device {
        bool lost = false;
        Nanos tried_at{};
    };
    std::vector<WatchedLine> lines_;
    std::vector<Device> devices_;
    LineBoard& board_;
    WatchdogSettings settings_;
    std::unique_ptr<Watchdog> watchdog_;
    Nanos looked_at_{}, watchdog_tried_at_{};
    bool watched_ = true;
};

} // namespace millpond
