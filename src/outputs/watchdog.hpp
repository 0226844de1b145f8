// A process of its own that lowers the lines when the session's program cannot: when that program has died, however it
// died, and when a line has been high for too long.
//
// It is forked from this one, so it has the outputs and their open devices; it takes no signal that can be ignored, and
// is in a session of its own, so that neither Ctrl-C nor a signal to the process group takes it. The end of the
// session's program reaches it as the end of a socket, which the kernel closes whatever killed the program.
#pragma once

#include "outputs/line_board.hpp"
#include "outputs/output.hpp"

#include <cstdint>
#include <span>
#include <string>
#include <sys/types.h>

namespace millpond {

struct WatchedLine {
    Output* output = nullptr;
    Nanos longest_high{};
};

struct WatchdogSettings {
    int priority = 0; ///< SCHED_FIFO priority it asks for; 0, or where that is refused: the ordinary scheduler
    bool lock_memory = false;
};

class Watchdog {
  public:
    /// Forks. Before other threads run, if it can be: a process forked later costs them a page fault for each page that
    /// they write next. Lines, at most most_outputs, and board outlive it. Throws std::runtime_error where the computer
    /// has no room for a process. Thread: control.
    Watchdog(std::span<const WatchedLine> lines, LineBoard& board, WatchdogSettings settings = {});
    /// Sends it home; it touches no line then.
    ~Watchdog();
    Watchdog(const Watchdog&) = delete;
    Watchdog& operator=(const Watchdog&) = delete;

    /// False once it has died, or stood still for over 3 s. Call every few tens of ms. Thread: control.
    [[nodiscard]] bool watches() noexcept;

    [[nodiscard]] pid_t process() const noexcept { return process_; }

  private:
    LineBoard& board_;
    pid_t process_ = -1;
    int life_line_ = -1; // closed by the kernel when this process ends
    bool ended_ = false;
    std::uint32_t beats_seen_ = 0;
    Nanos beat_seen_at_ = monotonic_now();
};

} // namespace millpond
