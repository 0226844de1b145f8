// Ctrl-C as a wish to stop, for long commands that can go on later. Thread: control.
#pragma once

#include <csignal>

namespace millpond {

/// While it lives, the first SIGINT or SIGTERM is a wish; a second one ends the program as ever. One at a time.
class StopSignals {
  public:
    StopSignals();
    StopSignals(const StopSignals&) = delete;
    StopSignals& operator=(const StopSignals&) = delete;
    ~StopSignals();

    [[nodiscard]] static bool wished() noexcept;

  private:
    struct sigaction interrupt_before_ {
    }, terminate_before_{};
};

} // namespace millpond
